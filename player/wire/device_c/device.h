/* The device's side of Drawcord's wire protocol, version 1, for any board that C99 reaches.

   No allocation, no operating system, no clock: bytes and times in, bytes and valve values out. What it does is said rule by
   rule in the manual's page on the wire; how to put it on a board, in the page on porting. Not reentrant: two contexts that
   call it (a main loop and a timer's interrupt) keep each other out. */

#ifndef DRAWCORD_DEVICE_H
#define DRAWCORD_DEVICE_H

#include "frames.h"

#define DC_VERSION 1
#define DC_ARM_KEY 0x41524D21u
#define DC_NO_CHANNEL 0xFFFFu
#define DC_NOT_SENSED 0xFFFFu
#define DC_SHUT 32768u          /* a valve's opening of zero */
#define DC_STATE_EVERY_US 50000 /* between two states that nobody asked for */

enum dc_status { DC_IDLE, DC_ARMED, DC_VENTED, DC_FAULT };
enum dc_fault { DC_WATCHDOG = 1, DC_RIG_MISMATCH, DC_NOT_ARMED, DC_BAD_COMMAND, DC_QUEUE_FULL, DC_OVER_PRESSURE, DC_SENSOR };
enum dc_drive { DC_PRESSURE, DC_STRAIN, DC_VALVE };

/* What a board is and what it can do. It outlives the device. `set_valve` and `send` are needed; the others may be NULL:
   a board without `strain` or `supply` does not sense it. None of them may call the device. */
struct dc_board {
    const char *name;     /* UTF-8, at most DC_TEXT_LIMIT bytes */
    uint16_t channels;    /* 1 to DC_CHANNELS */
    const uint8_t *drive; /* an enum dc_drive for each channel; NULL: DC_PRESSURE for all */
    int knows_rig;        /* whether the board serves one rig alone */
    uint32_t rig;         /* and which: CRC-32 of its canonical form */
    void *context;        /* handed to every function below */

    void (*set_valve)(void *context, uint16_t channel, uint16_t value);       /* 0 exhausts, whatever the drive */
    void (*send)(void *context, const uint8_t *bytes, uint16_t count);        /* one frame for the host, whole */
    uint16_t (*strain)(void *context, uint16_t channel);                      /* 0 to 65535 is rest to usable stroke */
    uint16_t (*supply)(void *context);                                        /* kPa gauge x 10 */
    void (*applied)(void *context, uint32_t arrival_us, uint32_t due_us, uint16_t first, uint16_t count, int late);
    void (*changed)(void *context, enum dc_status was, enum dc_status now, const char *why);
    void (*told)(void *context, enum dc_fault code, uint16_t channel, const char *text);
};

/* A set that waits. */
struct dc_set {
    uint64_t at_us;
    uint32_t arrival_us, due_us;
    uint16_t first, count;
    uint16_t value[DC_CHANNELS];
};

/* All that a device remembers; `status`, `queued`, `late`, `bad` and `value` may be read from outside. */
struct dc_device {
    const struct dc_board *board;
    enum dc_status status;
    uint16_t queued; /* sets that wait */
    uint16_t room;   /* how many may wait: DC_QUEUE */
    uint32_t late;   /* sets that came after their time */
    uint32_t bad;    /* frames dropped */
    uint16_t value[DC_CHANNELS];

    uint64_t now_us, heard_us, state_us; /* own time since the start, which does not wrap */
    uint32_t clock_us;                   /* the board's clock when it was last told, which does */
    uint32_t watchdog_us;
    uint16_t channels; /* configured; 0: none */
    int greeted;

    int resting;
    uint64_t rest_us;
    uint16_t rest_ms, rest_done;
    uint16_t rest_from[DC_CHANNELS];

    struct dc_set set[DC_QUEUE];
    uint16_t order[DC_QUEUE]; /* places in `set`: those that wait, the soonest first, then those that are free */

    struct dc_in in;
    struct dc_out out;
};

/* Begin, vented: every valve is set to 0. Returns 0, and does nothing, for a board that cannot be. Also what a reset is. */
int dc_start(struct dc_device *device, const struct dc_board *board, uint32_t now_us);

/* Bytes that came, in pieces of any size; first does what time has brought. */
void dc_receive(struct dc_device *device, const uint8_t *bytes, size_t count, uint32_t now_us);

/* Do what time has brought: sets due, ramp, watchdog, state. */
void dc_advance(struct dc_device *device, uint32_t now_us);

/* How long until `dc_advance` has something to do, in us; 0: at once. Later is allowed, and shows at the valves. */
uint32_t dc_wait_us(const struct dc_device *device, uint32_t now_us);

/* A fault that the board has found by itself (DC_OVER_PRESSURE, DC_SENSOR): vents, says so. */
void dc_fail(struct dc_device *device, enum dc_fault code, uint16_t channel, const char *text, uint32_t now_us);

#endif
