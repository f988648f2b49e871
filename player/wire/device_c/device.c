/* What a device does; see device.h, and the manual's page on the wire for the rules, whose numbers stand below. */

#include "device.h"

#include <string.h>

#define RAMP_STEP_US 1000u
#define BACK_LIMIT_US 1000000u /* a clock that goes back by less is taken to stand still */
#define TURN_HALF 0x80000000u

enum type {
    HELLO = 0x01, CONFIGURE, ARM, SET, VENT, REST, PING,
    TO_HOST = 0x80, BOARD, STATE, SENSE, FAULTED, PONG = 0x87
};

static const uint8_t body_size[] = {0, 1, 8, 4, 8, 0, 2, 4}; /* by type; a set's without its values */

struct refusal {
    enum dc_fault code;
    const char *text;
};

static const struct refusal
    no_form = {DC_BAD_COMMAND, "no such message, or its body has the wrong size"},
    no_version = {DC_BAD_COMMAND, "this device speaks version 1"},
    no_hello = {DC_BAD_COMMAND, "hello has to come first"},
    is_armed = {DC_BAD_COMMAND, "configure while armed"},
    no_watchdog = {DC_BAD_COMMAND, "a watchdog of 0 ms"},
    no_channels = {DC_BAD_COMMAND, "more channels than there are, or none"},
    other_rig = {DC_RIG_MISMATCH, "this device serves another rig"},
    wrong_key = {DC_BAD_COMMAND, "wrong key"},
    no_configure = {DC_BAD_COMMAND, "configure has to come first"},
    is_resting = {DC_BAD_COMMAND, "arm while coming to rest"},
    not_armed = {DC_NOT_ARMED, "set while not armed"},
    no_values = {DC_BAD_COMMAND, "set of no values"},
    no_such_channel = {DC_BAD_COMMAND, "set of a channel that is not configured"},
    queue_full = {DC_QUEUE_FULL, "the queue is full"},
    silence = {DC_WATCHDOG, "no frame from the host"};

static const char *const fault_names[] = {
    "", "watchdog", "rig mismatch", "not armed", "bad command", "queue full", "over-pressure", "sensor"};

/* What it says. */

static void send(struct dc_device *d)
{
    uint16_t count = dc_end(&d->out);
    d->board->send(d->board->context, d->out.bytes, count);
}

static void say_state(struct dc_device *d, uint8_t seq)
{
    dc_begin(&d->out, STATE, seq);
    dc_put32(&d->out, d->clock_us);
    dc_put8(&d->out, d->status);
    dc_put16(&d->out, d->queued);
    dc_put32(&d->out, d->late);
    dc_put32(&d->out, d->bad);
    dc_put16(&d->out, d->board->supply ? d->board->supply(d->board->context) : DC_NOT_SENSED);
    send(d);
}

static void say_sense(struct dc_device *d)
{
    uint32_t first, channel;

    for (first = 0; first < d->channels; first += DC_SENSED) {
        uint32_t left = d->channels - first, count = left < DC_SENSED ? left : DC_SENSED;
        dc_begin(&d->out, SENSE, 0);
        dc_put32(&d->out, d->clock_us);
        dc_put16(&d->out, (unsigned)first);
        dc_put16(&d->out, (unsigned)count);
        for (channel = first; channel < first + count; channel++)
            dc_put16(&d->out, d->board->strain(d->board->context, (uint16_t)channel));
        send(d);
    }
}

static void tell(struct dc_device *d, enum dc_fault code, uint16_t channel, const char *text, uint8_t seq)
{
    if (d->board->told)
        d->board->told(d->board->context, code, channel, text);
    dc_begin(&d->out, FAULTED, seq);
    dc_put8(&d->out, code);
    dc_put16(&d->out, channel);
    dc_put_text(&d->out, text);
    send(d);
}

static void refuse(struct dc_device *d, const struct refusal *why, uint8_t seq)
{
    tell(d, why->code, DC_NO_CHANNEL, why->text, seq);
}

/* What it does. */

static void move(struct dc_device *d, uint32_t channel, uint16_t value)
{
    d->value[channel] = value;
    d->board->set_valve(d->board->context, (uint16_t)channel, value);
}

static void become(struct dc_device *d, enum dc_status status, const char *why)
{
    enum dc_status was = d->status;
    d->status = status;
    if (was != status && d->board->changed)
        d->board->changed(d->board->context, was, status, why);
}

/* Every channel to 0, the queue and the ramp dropped: before any word of it goes out. */
static void exhaust(struct dc_device *d, enum dc_status status, const char *why)
{
    uint32_t channel;

    for (channel = 0; channel < d->board->channels; channel++)
        move(d, channel, 0);
    d->queued = 0;
    d->resting = 0;
    become(d, status, why);
}

static void apply(struct dc_device *d, const struct dc_set *set, int late)
{
    uint32_t at;

    for (at = 0; at < set->count; at++)
        move(d, set->first + at, set->value[at]);
    if (d->board->applied)
        d->board->applied(d->board->context, set->arrival_us, set->due_us, set->first, set->count, late);
}

/* What time brings (rules 9, 10, 13, 14). */

static uint64_t later(const struct dc_device *d, uint32_t clock_us)
{
    uint32_t passed = clock_us - d->clock_us;
    return passed > 0u - BACK_LIMIT_US ? d->now_us : d->now_us + passed;
}

static uint64_t trips_us(const struct dc_device *d) { return d->heard_us + d->watchdog_us; }

/* The last step of the ramp that is due, and its end. */
static void step(struct dc_device *d, uint64_t until_us)
{
    uint64_t steps = (until_us - d->rest_us) / RAMP_STEP_US;
    uint16_t now = steps < d->rest_ms ? (uint16_t)steps : d->rest_ms;
    uint32_t channel;

    if (now > d->rest_done) {
        d->rest_done = now;
        for (channel = 0; channel < d->board->channels; channel++) {
            uint32_t from = d->rest_from[channel];
            move(d, channel, (uint16_t)(from - from * now / d->rest_ms));
        }
    }
    if (now >= d->rest_ms) {
        exhaust(d, DC_IDLE, "at rest");
        say_state(d, 0);
    }
}

static void bring(struct dc_device *d, uint32_t clock_us)
{
    uint64_t now = later(d, clock_us);

    if (now != d->now_us)
        d->clock_us = clock_us;
    d->now_us = now;
    for (;;) {
        uint64_t trips = d->status == DC_ARMED ? trips_us(d) : now + 1, until = now < trips ? now : trips;
        if (d->queued && d->set[d->order[0]].at_us <= until) {
            uint16_t place = d->order[0];
            d->queued--;
            memmove(d->order, d->order + 1, d->queued * sizeof d->order[0]);
            d->order[d->queued] = place;
            apply(d, &d->set[place], 0);
            continue;
        }
        if (d->resting) {
            step(d, until);
            if (!d->resting)
                continue;
        }
        if (trips <= now) {
            refuse(d, &silence, 0);
            exhaust(d, DC_VENTED, "watchdog");
            say_state(d, 0);
        }
        break;
    }
    if (now >= d->state_us) {
        d->state_us += (now - d->state_us) / DC_STATE_EVERY_US * DC_STATE_EVERY_US + DC_STATE_EVERY_US;
        say_state(d, 0);
        if (d->board->strain && d->channels)
            say_sense(d);
    }
}

/* What frames bring. */

static void hello(struct dc_device *d, const uint8_t *body, uint8_t seq)
{
    const struct dc_board *board = d->board;

    exhaust(d, DC_IDLE, "hello");
    d->channels = 0;
    d->greeted = body[0] == DC_VERSION;
    dc_begin(&d->out, BOARD, seq);
    dc_put8(&d->out, DC_VERSION);
    dc_put8(&d->out, (board->strain ? 1u : 0u) | (board->supply ? 2u : 0u));
    dc_put16(&d->out, board->channels);
    dc_put16(&d->out, DC_QUEUE);
    dc_put32(&d->out, d->clock_us);
    dc_put_text(&d->out, board->name);
    send(d);
    if (!d->greeted)
        refuse(d, &no_version, seq);
}

static void configure(struct dc_device *d, const uint8_t *body, uint8_t seq)
{
    uint16_t channels = dc_u16(body), watchdog_ms = dc_u16(body + 2);

    if (!d->greeted || d->status == DC_VENTED || d->status == DC_FAULT) {
        refuse(d, &no_hello, seq);
    } else if (d->status == DC_ARMED) {
        refuse(d, &is_armed, seq);
    } else if (!watchdog_ms) {
        refuse(d, &no_watchdog, seq);
    } else if (!channels || channels > d->board->channels) {
        refuse(d, &no_channels, seq);
    } else if (d->board->knows_rig && d->board->rig != dc_u32(body + 4)) {
        refuse(d, &other_rig, seq);
        exhaust(d, DC_FAULT, fault_names[DC_RIG_MISMATCH]);
    } else {
        d->channels = channels;
        d->watchdog_us = watchdog_ms * (uint32_t)1000;
    }
}

static void arm(struct dc_device *d, const uint8_t *body, uint8_t seq)
{
    if (dc_u32(body) != DC_ARM_KEY)
        refuse(d, &wrong_key, seq);
    else if (d->status == DC_VENTED || d->status == DC_FAULT)
        refuse(d, &no_hello, seq);
    else if (!d->channels)
        refuse(d, &no_configure, seq);
    else if (d->resting)
        refuse(d, &is_resting, seq);
    else
        become(d, DC_ARMED, "arm");
}

static void take_set(struct dc_device *d, const uint8_t *body, uint8_t seq)
{
    uint32_t due_us = dc_u32(body), ahead = due_us ? due_us - d->clock_us : 0, at;
    uint16_t first = dc_u16(body + 4), count = dc_u16(body + 6), place = 0;
    int waits = ahead > 0 && ahead < TURN_HALF, late = ahead >= TURN_HALF;
    struct dc_set *set;

    if (d->status != DC_ARMED || d->resting) {
        refuse(d, &not_armed, seq);
        return;
    }
    if (!count) {
        refuse(d, &no_values, seq);
        return;
    }
    if ((uint32_t)first + count > d->channels) {
        tell(d, no_such_channel.code, first > d->channels ? first : d->channels, no_such_channel.text, seq);
        return;
    }
    if (!waits) {
        /* Applied from the frame itself: the queue may be full. */
        d->late += (uint32_t)late;
        for (at = 0; at < count; at++)
            move(d, first + at, dc_u16(body + 8 + 2 * at));
        if (d->board->applied)
            d->board->applied(d->board->context, d->clock_us, due_us, first, count, late);
        return;
    }
    if (d->queued >= d->room) {
        refuse(d, &queue_full, seq);
        return;
    }
    set = &d->set[d->order[d->queued]];
    set->at_us = d->now_us + ahead;
    set->arrival_us = d->clock_us;
    set->due_us = due_us;
    set->first = first;
    set->count = count;
    for (at = 0; at < count; at++)
        set->value[at] = dc_u16(body + 8 + 2 * at);
    /* In before those due later, behind those due at the same time. */
    place = d->queued++;
    while (place && d->set[d->order[place - 1]].at_us > set->at_us) {
        d->order[place] = d->order[place - 1];
        place--;
    }
    d->order[place] = (uint16_t)(set - d->set);
}

static void rest(struct dc_device *d, const uint8_t *body)
{
    uint16_t ramp_ms = dc_u16(body);
    uint32_t channel;

    if (d->status != DC_ARMED)
        return;
    d->queued = 0;
    if (!ramp_ms) {
        exhaust(d, DC_IDLE, "at rest");
        return;
    }
    d->resting = 1;
    d->rest_us = d->now_us;
    d->rest_ms = ramp_ms;
    d->rest_done = 0;
    for (channel = 0; channel < d->board->channels; channel++) {
        uint16_t from = d->value[channel];
        if (d->board->drive && d->board->drive[channel] == DC_VALVE && from > DC_SHUT)
            from = DC_SHUT;
        d->rest_from[channel] = from;
        move(d, channel, from);
    }
}

/* A frame's type, sequence number and body. */
static void take(struct dc_device *d, const uint8_t *payload, int size_of_all)
{
    const uint8_t type = payload[0], seq = payload[1], *body = payload + 2;
    const int32_t size = size_of_all - 2;

    if (type >= TO_HOST) {
        d->bad++;
        return;
    }
    if (type < HELLO || type > PING || size < body_size[type] ||
        size != body_size[type] + (type == SET ? 2 * (int32_t)dc_u16(body + 6) : 0)) {
        refuse(d, &no_form, seq);
        return;
    }
    d->heard_us = d->now_us;
    switch (type) {
    case HELLO: hello(d, body, seq); break;
    case CONFIGURE: configure(d, body, seq); break;
    case ARM: arm(d, body, seq); break;
    case SET: take_set(d, body, seq); return;
    case VENT: exhaust(d, DC_VENTED, "vent"); break;
    case REST: rest(d, body); break;
    default:
        dc_begin(&d->out, PONG, seq);
        dc_put32(&d->out, dc_u32(body));
        dc_put32(&d->out, d->clock_us);
        send(d);
        return;
    }
    say_state(d, seq);
}

/* What the world does to it. */

int dc_start(struct dc_device *d, const struct dc_board *board, uint32_t now_us)
{
    uint32_t place;

    if (!board->set_valve || !board->send || !board->name || !board->channels || board->channels > DC_CHANNELS ||
        strlen(board->name) > DC_TEXT_LIMIT)
        return 0;
    memset(d, 0, sizeof *d);
    d->board = board;
    d->status = DC_VENTED;
    d->room = DC_QUEUE;
    d->clock_us = now_us;
    d->state_us = DC_STATE_EVERY_US;
    for (place = 0; place < DC_QUEUE; place++)
        d->order[place] = (uint16_t)place;
    exhaust(d, DC_VENTED, "start");
    return 1;
}

void dc_receive(struct dc_device *d, const uint8_t *bytes, size_t count, uint32_t now_us)
{
    bring(d, now_us);
    while (count--) {
        int size = dc_read(&d->in, *bytes++);
        if (size > 0)
            take(d, d->in.bytes, size);
        else if (size < 0)
            d->bad++;
    }
}

void dc_advance(struct dc_device *d, uint32_t now_us) { bring(d, now_us); }

uint32_t dc_wait_us(const struct dc_device *d, uint32_t now_us)
{
    uint64_t now = later(d, now_us), next = d->state_us, at;

    if (d->queued && d->set[d->order[0]].at_us < next)
        next = d->set[d->order[0]].at_us;
    if (d->resting && (at = d->rest_us + (d->rest_done + (uint64_t)1) * RAMP_STEP_US) < next)
        next = at;
    if (d->status == DC_ARMED && trips_us(d) < next)
        next = trips_us(d);
    return next > now ? (uint32_t)(next - now) : 0;
}

void dc_fail(struct dc_device *d, enum dc_fault code, uint16_t channel, const char *text, uint32_t now_us)
{
    bring(d, now_us);
    tell(d, code, channel, text, 0);
    exhaust(d, DC_FAULT, fault_names[code]);
    say_state(d, 0);
}
