/* See record.h. One ring of records: the board puts, the thread takes, neither waits for the other. */

#define _POSIX_C_SOURCE 200809L

#include "record.h"

#include <inttypes.h>
#include <pthread.h>
#include <stdio.h>
#include <string.h>
#include <time.h>

#define ROOM 8192u /* 16 s of sets at 500 Hz */
#define EVERY_NS 20000000

static struct record ring[ROOM];
static uint32_t put_count, taken_count, lost_count;
static int ending, is_open;
static FILE *file;
static const char *file_path;
static pthread_t thread;

static void write_one(const struct record *r)
{
    if (!strcmp(r->event, "set"))
        fprintf(file, "set,%" PRId64 ".%06" PRId64 ",%" PRId64 ",%" PRId64 ",%" PRId64 ",%" PRId64 ",%" PRIu32 ",%" PRIu32 ",%s\n",
                r->host_ns / 1000000000, r->host_ns / 1000 % 1000000, r->arrival_us, r->due_us, r->applied_us,
                r->applied_us - (r->due_us ? r->due_us : r->arrival_us), r->first, r->count, r->note);
    else
        fprintf(file, "%s,%" PRId64 ".%06" PRId64 ",,,%" PRId64 ",,,,\"%s\"\n", r->event, r->host_ns / 1000000000,
                r->host_ns / 1000 % 1000000, r->applied_us, r->note);
}

static void *run(void *unused)
{
    const struct timespec pause = {0, EVERY_NS};
    int ends = 0, full = 0;

    (void)unused;
    while (!ends) {
        uint32_t until, lost;
        ends = __atomic_load_n(&ending, __ATOMIC_ACQUIRE);
        until = __atomic_load_n(&put_count, __ATOMIC_ACQUIRE);
        for (; taken_count != until; __atomic_store_n(&taken_count, taken_count + 1, __ATOMIC_RELEASE))
            if (!full)
                write_one(&ring[taken_count % ROOM]);
        lost = __atomic_exchange_n(&lost_count, 0, __ATOMIC_RELAXED);
        if (lost && !full)
            fprintf(file, "mishap,,,,,,,,\"%" PRIu32 " lines lost: the disk was too slow\"\n", lost);
        if (!full && (fflush(file) || ferror(file))) {
            /* The board goes on: a log that is full must not leave valves open. */
            full = 1;
            fprintf(stderr, "%s: the log ends here: it could not be written\n", file_path);
        }
        if (!ends)
            nanosleep(&pause, NULL);
    }
    fclose(file);
    return NULL;
}

int record_open(const char *path)
{
    file_path = path;
    file = fopen(path, "w");
    if (!file)
        return 0;
    fputs("event,host_s,arrival_us,due_us,applied_us,late_us,first,count,note\n", file);
    is_open = !pthread_create(&thread, NULL, run, NULL);
    return is_open;
}

void record_put(const struct record *record)
{
    if (!is_open)
        return;
    if (put_count - __atomic_load_n(&taken_count, __ATOMIC_ACQUIRE) >= ROOM) {
        __atomic_fetch_add(&lost_count, 1, __ATOMIC_RELAXED);
        return;
    }
    ring[put_count % ROOM] = *record;
    __atomic_store_n(&put_count, put_count + 1, __ATOMIC_RELEASE);
}

void record_close(void)
{
    if (!is_open)
        return;
    __atomic_store_n(&ending, 1, __ATOMIC_RELEASE);
    pthread_join(thread, NULL);
}
