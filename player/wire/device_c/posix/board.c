/* A simulated board behind a pseudo-terminal, around the device: the first line printed is the path of the terminal.

   Four threads: this one serves the line; one does what is due and nothing else; one moves the fibers; one writes the log.
   Ends on SIGINT, SIGTERM and SIGHUP, with every channel vented. */

#define _XOPEN_SOURCE 700

#include "line.h"
#include "plant.h"
#include "record.h"

#include <pthread.h>
#include <sched.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>
#ifdef __linux__
#include <sys/prctl.h>
#endif

#define SECOND 1000000000
#define SPIN_NS 200000 /* the last fraction before a due time is spent asking the time: sleepers wake so much too late */
#define LOOK_NS 50000000
#define JUMP_NS 100000000
#define PRIORITY 40 /* above the player's on the same machine: a true board has a processor of its own */

/* What can go wrong so many seconds after arming, once; channel 0 where it is one channel's. */
enum strike { RESET, SILENT, JUMP, GARBLE, MISREAD, OVER_PRESSURE, SENSOR, STUCK, RAILED, LEAK, LOW_SUPPLY, STRIKES };

static struct {
    const char *option, *says;
    double after_s; /* below 0: never */
} strikes[STRIKES] = {
    {"--reset-after", "starts anew, vented, its clock at 0", -1.0},
    {"--silent-after", "neither hears nor says anything more", -1.0},
    {"--jump-after", "its clock jumps ahead by 0.1 s", -1.0},
    {"--garble-after", "bytes of the line begin to become others", -1.0},
    {"--misread-after", "it hears a command that makes no sense", -1.0},
    {"--over-pressure-after", "finds channel 0 over its pressure", -1.0},
    {"--sensor-after", "the sensor of channel 0 fails", -1.0},
    {"--stuck-valve-after", "the valve of channel 0 no longer moves", -1.0},
    {"--railed-after", "the sensor of channel 0 reads full stroke", -1.0},
    {"--leak-after", "the fiber of channel 0 loses half of its strain each second", -1.0},
    {"--low-supply-after", "the supply reads below the rig's least", -1.0},
};

static const char *const status_names[] = {"idle", "armed", "vented", "fault"};
static const char *const fault_names[] = {
    "", "watchdog", "rig mismatch", "not armed", "bad command", "queue full", "over-pressure", "sensor"};

/* Held while the device is called, and for all below it. */
static pthread_mutex_t lock;
static pthread_cond_t sooner;
static struct dc_device device;
static struct dc_board board;
static struct plant plant;
static struct plant_wrongs wrongs = {-1, -1, -1, 0};
static struct line_wrongs line_wrongs;
static int64_t begin_ns, armed_ns, planned_ns;
static int mute, deaf, said;
static long clock_ppm, room = DC_QUEUE, parent;

static int ends, hurry; /* handed from thread to thread */

static int64_t clock_ns(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (int64_t)now.tv_sec * SECOND + now.tv_nsec;
}

static struct timespec at_ns(int64_t ns)
{
    struct timespec at;
    at.tv_sec = (time_t)(ns / SECOND);
    at.tv_nsec = (long)(ns % SECOND);
    return at;
}

/* The board's clock, before it wraps. */
static int64_t board_us(int64_t now_ns)
{
    int64_t us = (now_ns - begin_ns) / 1000;
    return us + us * clock_ppm / 1000000;
}

/* What the device calls. */

static void set_valve(void *context, uint16_t channel, uint16_t value)
{
    (void)context;
    __atomic_store_n(&plant.number[channel], value, __ATOMIC_RELAXED);
}

static void leave(void *context, const uint8_t *bytes, uint16_t count)
{
    (void)context;
    if (mute)
        return;
    line_put(bytes, count, clock_ns());
    said = 1;
}

static uint16_t strain(void *context, uint16_t channel)
{
    (void)context;
    return __atomic_load_n(&plant.reads[channel], __ATOMIC_RELAXED);
}

static uint16_t supply(void *context)
{
    (void)context;
    return __atomic_load_n(&plant.supply, __ATOMIC_RELAXED);
}

/* A time of the device, which wraps, as the one without wrapping that is nearest to now. */
static int64_t unwrapped(uint32_t us, int64_t now_us)
{
    uint32_t behind = (uint32_t)now_us - us;
    return behind < 0x80000000u ? now_us - behind : now_us + (uint32_t)(0u - behind);
}

static void applied(void *context, uint32_t arrival_us, uint32_t due_us, uint16_t first, uint16_t count, int late)
{
    struct record record = {"set", 0, 0, 0, 0, 0, 0, ""};

    (void)context;
    record.host_ns = clock_ns();
    record.applied_us = board_us(record.host_ns);
    record.arrival_us = unwrapped(arrival_us, record.applied_us);
    record.due_us = due_us ? unwrapped(due_us, record.applied_us) : 0;
    record.first = first;
    record.count = count;
    strcpy(record.note, late ? "late" : "");
    record_put(&record);
}

static void note(const char *event, const char *before, const char *between, const char *after)
{
    struct record record = {"", 0, 0, 0, 0, 0, 0, ""};

    record.event = event;
    record.host_ns = clock_ns();
    record.applied_us = board_us(record.host_ns);
    snprintf(record.note, sizeof record.note, "%s%s%s", before, between, after);
    record_put(&record);
}

static void changed(void *context, enum dc_status was, enum dc_status now, const char *why)
{
    char both[32];

    (void)context;
    snprintf(both, sizeof both, "%s to %s", status_names[was], status_names[now]);
    note("status", both, ": ", why);
    if (now == DC_ARMED)
        armed_ns = clock_ns();
    else if (now != DC_IDLE || was == DC_ARMED)
        armed_ns = 0;
}

static void told(void *context, enum dc_fault code, uint16_t channel, const char *text)
{
    char which[48];

    (void)context;
    snprintf(which, sizeof which, "%d %s, channel %u", (int)code, fault_names[code], (unsigned)channel);
    note("fault", which, ": ", text);
}

/* Begins the device, at power-on and at a reset. */
static void start(void)
{
    begin_ns = clock_ns();
    armed_ns = 0;
    dc_start(&device, &board, 0);
    device.room = (uint16_t)room;
}

/* The threads. */

/* When the device next has something to do, on the machine's clock. */
static int64_t due_ns(int64_t now_ns)
{
    int64_t wait_us = dc_wait_us(&device, (uint32_t)board_us(now_ns));
    return now_ns + wait_us * SECOND / (1000000 + clock_ppm);
}

/* Wakes the line's thread where the device has said something, and this thread's fellow where something is due sooner. */
static void after_device(int64_t now_ns)
{
    if (said)
        line_wake();
    said = 0;
    /* The clock's steps make the same time look a little sooner. */
    if (due_ns(now_ns) < planned_ns - 2000) {
        __atomic_store_n(&hurry, 1, __ATOMIC_RELAXED);
        pthread_cond_signal(&sooner);
    }
}

/* Does what is due, to the microsecond, and nothing else. */
static void *do_what_is_due(void *unused)
{
    (void)unused;
#ifdef __linux__
    prctl(PR_SET_TIMERSLACK, 1);
#endif
    pthread_mutex_lock(&lock);
    while (!__atomic_load_n(&ends, __ATOMIC_RELAXED)) {
        int64_t now_ns = clock_ns();

        planned_ns = due_ns(now_ns);
        if (planned_ns == now_ns) {
            dc_advance(&device, (uint32_t)board_us(now_ns));
            planned_ns = 0;
            after_device(now_ns);
            continue;
        }
        if (planned_ns - now_ns > SPIN_NS) {
            struct timespec until = at_ns(planned_ns - SPIN_NS);
            pthread_cond_timedwait(&sooner, &lock, &until);
        } else {
            int64_t until_ns = planned_ns;
            __atomic_store_n(&hurry, 0, __ATOMIC_RELAXED);
            pthread_mutex_unlock(&lock);
            while (clock_ns() < until_ns && !__atomic_load_n(&hurry, __ATOMIC_RELAXED))
                continue;
            pthread_mutex_lock(&lock);
        }
    }
    pthread_mutex_unlock(&lock);
    return NULL;
}

static void *move_fibers(void *unused)
{
    int64_t next_ns = clock_ns();

    (void)unused;
    while (!__atomic_load_n(&ends, __ATOMIC_RELAXED)) {
        struct plant_wrongs now;
        struct timespec until;

        next_ns += (int64_t)(PLANT_STEP_S * SECOND);
        until = at_ns(next_ns);
        clock_nanosleep(CLOCK_MONOTONIC, TIMER_ABSTIME, &until, NULL);
        __atomic_load(&wrongs.stuck, &now.stuck, __ATOMIC_RELAXED);
        __atomic_load(&wrongs.railed, &now.railed, __ATOMIC_RELAXED);
        __atomic_load(&wrongs.leaking, &now.leaking, __ATOMIC_RELAXED);
        __atomic_load(&wrongs.low_supply, &now.low_supply, __ATOMIC_RELAXED);
        plant_step(&plant, &now);
    }
    return NULL;
}

/* A set of a channel that no board has, as if the line had carried it; what was coming in before is cut off. */
static void misread(uint32_t now_us)
{
    static struct dc_out nonsense;
    static const uint8_t end = 0;

    dc_begin(&nonsense, 0x04, 0); /* set */
    dc_put32(&nonsense, 0);
    dc_put16(&nonsense, 65535);
    dc_put16(&nonsense, 1);
    dc_put16(&nonsense, 0);
    dc_receive(&device, &end, 1, now_us);
    dc_receive(&device, nonsense.bytes, dc_end(&nonsense), now_us);
}

static void happen(enum strike what, int64_t now_ns)
{
    note("mishap", strikes[what].says, "", "");
    switch (what) {
    case RESET:
        line_clear();
        start();
        break;
    case SILENT: mute = deaf = 1; break;
    case JUMP: begin_ns -= JUMP_NS; break;
    case GARBLE: line_garble(); break;
    case MISREAD: misread((uint32_t)board_us(now_ns)); break;
    case OVER_PRESSURE: dc_fail(&device, DC_OVER_PRESSURE, 0, "over-pressure", (uint32_t)board_us(now_ns)); break;
    case SENSOR: dc_fail(&device, DC_SENSOR, 0, "sensor failed", (uint32_t)board_us(now_ns)); break;
    case STUCK: __atomic_store_n(&wrongs.stuck, 0, __ATOMIC_RELAXED); break;
    case RAILED: __atomic_store_n(&wrongs.railed, 0, __ATOMIC_RELAXED); break;
    case LEAK: __atomic_store_n(&wrongs.leaking, 0, __ATOMIC_RELAXED); break;
    default: __atomic_store_n(&wrongs.low_supply, 1, __ATOMIC_RELAXED); break;
    }
}

static void serve(void)
{
    static uint8_t bytes[4096];

    while (!__atomic_load_n(&ends, __ATOMIC_RELAXED)) {
        size_t count;
        int64_t now_ns;
        int what;

        line_wait(clock_ns(), LOOK_NS);
        now_ns = clock_ns();
        count = line_read(bytes, sizeof bytes, now_ns);
        pthread_mutex_lock(&lock);
        now_ns = clock_ns();
        if (count && !deaf)
            dc_receive(&device, bytes, count, (uint32_t)board_us(now_ns));
        for (what = 0; what < STRIKES; what++)
            if (strikes[what].after_s >= 0.0 && armed_ns && (double)(now_ns - armed_ns) >= strikes[what].after_s * SECOND) {
                strikes[what].after_s = -1.0;
                happen((enum strike)what, now_ns);
            }
        after_device(now_ns);
        pthread_mutex_unlock(&lock);
        line_send(clock_ns());
        if (parent && getppid() != parent)
            __atomic_store_n(&ends, 1, __ATOMIC_RELAXED);
    }
}

static void stop(int number)
{
    (void)number;
    __atomic_store_n(&ends, 1, __ATOMIC_RELAXED);
    line_wake();
}

/* The beginning and the end. */

static int failed(const char *what, const char *why)
{
    fprintf(stderr, "%s: %s\n", what, why);
    return 2;
}

static int number(const char *text, double least, double most, double *value)
{
    char *end;
    *value = strtod(text, &end);
    return end != text && !*end && *value >= least && *value <= most;
}

/* Reads one option; returns how many words it takes, 0 where it is none. */
static int option(char **words, const char **plant_path, const char **log_path)
{
    int what;
    double value;

    if (!strcmp(words[0], "--mute"))
        return mute = 1;
    if (!strcmp(words[0], "--echo"))
        return line_wrongs.echoes = 1;
    if (!words[1])
        return 0;
    if (!strcmp(words[0], "--plant"))
        *plant_path = words[1];
    else if (!strcmp(words[0], "--log"))
        *log_path = words[1];
    else if (!strcmp(words[0], "--parent") && number(words[1], 1.0, 2e9, &value))
        parent = (long)value;
    else if (!strcmp(words[0], "--clock-ppm") && number(words[1], -500000.0, 500000.0, &value))
        clock_ppm = (long)value;
    else if (!strcmp(words[0], "--room") && number(words[1], 0.0, DC_QUEUE, &value))
        room = (long)value;
    else if (!strcmp(words[0], "--garble") && number(words[1], 0.0, 1000.0, &value))
        line_wrongs.garbled = (int)value;
    else if (!strcmp(words[0], "--lose") && number(words[1], 0.0, 1000.0, &value))
        line_wrongs.lost = (int)value;
    else if (!strcmp(words[0], "--cut") && number(words[1], 0.0, 1000.0, &value))
        line_wrongs.cut = (int)value;
    else if (!strcmp(words[0], "--late-ms") && number(words[1], 0.0, 60000.0, &value))
        line_wrongs.late_ns = (int64_t)(value * 1e6);
    else {
        for (what = 0; what < STRIKES && strcmp(words[0], strikes[what].option); what++)
            continue;
        if (what == STRIKES || !number(words[1], 0.0, 1e6, &strikes[what].after_s))
            return 0;
    }
    return 2;
}

static void ready_locks(void)
{
    pthread_mutexattr_t inherits;
    pthread_condattr_t steady;

    pthread_mutexattr_init(&inherits);
    pthread_mutexattr_setprotocol(&inherits, PTHREAD_PRIO_INHERIT);
    pthread_mutex_init(&lock, &inherits);
    pthread_condattr_init(&steady);
    pthread_condattr_setclock(&steady, CLOCK_MONOTONIC);
    pthread_cond_init(&sooner, &steady);
}

/* Where the system permits it, other work does not hold a due set up; where not, the log shows what it costs. */
static void urgent(pthread_t thread, int priority)
{
    struct sched_param how;

    memset(&how, 0, sizeof how);
    how.sched_priority = priority;
    pthread_setschedparam(thread, SCHED_FIFO, &how);
}

int main(int count, char **words)
{
    const char *plant_path = NULL, *log_path = NULL, *wrong, *path;
    struct sigaction action;
    sigset_t ending;
    pthread_t due, fibers;
    int at, taken;
    uint16_t channel;

    for (at = 1; at < count; at += taken)
        if (!(taken = option(words + at, &plant_path, &log_path)))
            return failed(words[at], "no such option, or its value is missing or out of range");
    if (!plant_path)
        return failed("--plant", "missing: the file of the board's parameters");
    if ((wrong = plant_read(&plant, plant_path)))
        return failed(plant_path, wrong);
    line_wrongs.garbles_later = strikes[GARBLE].after_s >= 0.0;
    if (!(path = line_open(&line_wrongs)))
        return failed("pseudo-terminal", "the system gives none");
    /* Before any thread, so that signals come to this one alone. */
    sigemptyset(&ending);
    sigaddset(&ending, SIGINT);
    sigaddset(&ending, SIGTERM);
    sigaddset(&ending, SIGHUP);
    pthread_sigmask(SIG_BLOCK, &ending, NULL);
    if (log_path && !record_open(log_path))
        return failed(log_path, "the log cannot be written");
    board.name = plant.name;
    board.channels = (uint16_t)plant.channels;
    board.drive = plant.drive;
    board.knows_rig = 1;
    board.rig = plant.rig;
    board.set_valve = set_valve;
    board.send = leave;
    board.strain = strain;
    board.supply = supply;
    board.applied = applied;
    board.changed = changed;
    board.told = told;
    ready_locks();
    start();
    if (pthread_create(&due, NULL, do_what_is_due, NULL) || pthread_create(&fibers, NULL, move_fibers, NULL))
        return failed("threads", "the system gives none");
    urgent(due, PRIORITY);
    urgent(pthread_self(), PRIORITY - 1);
    urgent(fibers, PRIORITY - 2);
    memset(&action, 0, sizeof action);
    action.sa_handler = stop;
    sigaction(SIGINT, &action, NULL);
    sigaction(SIGTERM, &action, NULL);
    sigaction(SIGHUP, &action, NULL);
    pthread_sigmask(SIG_UNBLOCK, &ending, NULL);
    puts(path);
    fflush(stdout);
    serve();
    pthread_join(due, NULL);
    pthread_join(fibers, NULL);
    for (channel = 0; channel < board.channels; channel++)
        set_valve(NULL, channel, 0);
    note("end", "every channel vented", "", "");
    record_close();
    return 0;
}
