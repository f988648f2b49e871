/* Frames: type, sequence number, body and CRC, stuffed so that 0x00 stands between frames and nowhere else.

   Stuffing is COBS (S. Cheshire and M. Baker, "Consistent Overhead Byte Stuffing", IEEE/ACM Transactions on Networking 7(2),
   1999). The CRC is CRC-16/IBM-3740, sent low byte first. The sizes of everything are set here. */

#ifndef DRAWCORD_FRAMES_H
#define DRAWCORD_FRAMES_H

#include <stddef.h>
#include <stdint.h>

#ifndef DC_CHANNELS
#define DC_CHANNELS 48 /* most channels that a board has */
#endif
#ifndef DC_QUEUE
#define DC_QUEUE 64 /* sets that wait for their time */
#endif
#if DC_CHANNELS < 1 || DC_CHANNELS > 65535 || DC_QUEUE < 64 || DC_QUEUE > 65535
#error "a device has 1 to 65535 channels and room for 64 to 65535 sets"
#endif

#define DC_BODY_LIMIT 2048   /* most bytes of a frame's body */
#define DC_TEXT_LIMIT 255    /* most bytes of a name or of a fault's text */
#define DC_VALUES_LIMIT 1020 /* most values in one frame */
#define DC_SENSED (DC_CHANNELS < DC_VALUES_LIMIT ? DC_CHANNELS : DC_VALUES_LIMIT)

/* Most bytes that n take when stuffed, then of what comes in and of what goes out. */
#define DC_STUFFED(n) ((n) + 1 + (n) / 254)
#define DC_IN_LIMIT DC_STUFFED(DC_BODY_LIMIT + 4)
#define DC_SENSE_BODY (8 + 2 * DC_SENSED)
#define DC_TEXT_BODY (10 + DC_TEXT_LIMIT)
#define DC_OUT_BODY (DC_SENSE_BODY > DC_TEXT_BODY ? DC_SENSE_BODY : DC_TEXT_BODY)
#define DC_OUT_LIMIT (DC_STUFFED(DC_OUT_BODY + 4) + 1)

/* A frame on its way in. */
struct dc_in {
    uint8_t bytes[DC_IN_LIMIT];
    uint16_t count;
    uint8_t whole, too_long;
};

/* A frame on its way out, stuffed as it grows; `code` is the place of the block's code. */
struct dc_out {
    uint8_t bytes[DC_OUT_LIMIT];
    uint16_t count, code, crc;
};

/* CRC-16/IBM-3740 of `count` bytes more; begins with 0xFFFF. */
uint16_t dc_crc(uint16_t crc, const uint8_t *bytes, size_t count);

/* What was stuffed, in place; returns its length, or -1 where it was no COBS. */
int dc_unstuff(uint8_t *bytes, size_t count);

/* One byte more: above 0, a good frame is in `bytes`, of so many bytes of type, sequence number and body, until the next
   byte; -1, a frame was dropped; 0, neither. */
int dc_read(struct dc_in *in, uint8_t byte);

/* Begin a frame; put its body; end it, which returns how many bytes it has on the line, delimiter included. */
void dc_begin(struct dc_out *out, uint8_t type, uint8_t seq);
void dc_put8(struct dc_out *out, unsigned value);
void dc_put16(struct dc_out *out, unsigned value);
void dc_put32(struct dc_out *out, uint32_t value);
void dc_put_text(struct dc_out *out, const char *text);
uint16_t dc_end(struct dc_out *out);

/* Numbers as they lie in a body. */
uint16_t dc_u16(const uint8_t *at);
uint32_t dc_u32(const uint8_t *at);

#endif
