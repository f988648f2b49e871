/* The board's end of a pseudo-terminal, and what can be wrong with a line on purpose. */

#ifndef DRAWCORD_LINE_H
#define DRAWCORD_LINE_H

#include <stddef.h>
#include <stdint.h>

/* Of a thousand bytes, each way, so many become others (at once, or from `line_garble` on), so many are lost; of a thousand
   frames so many are cut off anywhere; every byte heard is sent back; all leaves late. */
struct line_wrongs {
    int garbled, garbles_later, lost, cut, echoes;
    int64_t late_ns;
};

/* Opens a terminal in raw mode; returns its path, or NULL. It outlives the hosts that open and close it. */
const char *line_open(const struct line_wrongs *wrongs);

/* Waits for bytes, for room for those that are to leave, for `line_wake`, or for `most_ns`. */
void line_wait(int64_t now_ns, int64_t most_ns);

/* Ends a wait; may be called from a signal's handler. */
void line_wake(void);

/* What has come, at most `room` bytes; never waits. */
size_t line_read(uint8_t *bytes, size_t room, int64_t now_ns);

/* Bytes that are to leave; never waits. */
void line_put(const uint8_t *bytes, size_t count, int64_t now_ns);

/* Sends what is to leave by now and fits. */
void line_send(int64_t now_ns);

/* From now on bytes become others. */
void line_garble(void);

/* Forgets what has not left. */
void line_clear(void);

#endif
