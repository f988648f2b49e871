/* The board's log: CSV, one line for each set, change of status and fault, written by a thread of its own. */

#ifndef DRAWCORD_RECORD_H
#define DRAWCORD_RECORD_H

#include <stdint.h>

struct record {
    const char *event; /* "set", "status", "fault", "mishap", "end" */
    int64_t host_ns, arrival_us, due_us, applied_us;
    uint32_t first, count;
    char note[120];
};

/* Begins the file and its thread; returns 0 where the file cannot be written. */
int record_open(const char *path);

/* Takes one line; never waits. Callers keep each other out. */
void record_put(const struct record *record);

/* Writes what is left. */
void record_close(void);

#endif
