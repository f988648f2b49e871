/* See frames.h. */

#include "frames.h"

uint16_t dc_u16(const uint8_t *at) { return (uint16_t)((unsigned)at[1] << 8 | at[0]); }

uint32_t dc_u32(const uint8_t *at) { return (uint32_t)dc_u16(at + 2) << 16 | dc_u16(at); }

uint16_t dc_crc(uint16_t crc, const uint8_t *bytes, size_t count)
{
    /* What four bits shifted out of the register bring back into it. */
    static const uint16_t back[16] = {0x0000, 0x1021, 0x2042, 0x3063, 0x4084, 0x50A5, 0x60C6, 0x70E7,
                                      0x8108, 0x9129, 0xA14A, 0xB16B, 0xC18C, 0xD1AD, 0xE1CE, 0xF1EF};

    while (count--) {
        unsigned byte = *bytes++;
        crc = (uint16_t)((unsigned)crc << 4 ^ back[crc >> 12 ^ byte >> 4]);
        crc = (uint16_t)((unsigned)crc << 4 ^ back[crc >> 12 ^ (byte & 0x0F)]);
    }
    return crc;
}

int dc_unstuff(uint8_t *bytes, size_t count)
{
    size_t at = 0, to = 0;

    if (!count)
        return -1;
    for (;;) {
        size_t code = bytes[at], past = at + code;
        if (!code || past > count)
            return -1;
        for (at++; at < past; at++) {
            if (!bytes[at])
                return -1;
            bytes[to++] = bytes[at];
        }
        if (past == count)
            return (int)to;
        if (code != 0xFF)
            bytes[to++] = 0;
    }
}

int dc_read(struct dc_in *in, uint8_t byte)
{
    int count, dropped = in->too_long;

    if (in->whole) {
        in->whole = 0;
        in->count = 0;
    }
    if (byte) {
        if (in->count < DC_IN_LIMIT)
            in->bytes[in->count++] = byte;
        else
            in->too_long = 1;
        return 0;
    }
    in->whole = 1;
    in->too_long = 0;
    if (dropped)
        return -1;
    if (!in->count)
        return 0;
    count = dc_unstuff(in->bytes, in->count);
    if (count < 4 || count > DC_BODY_LIMIT + 4 ||
        dc_crc(0xFFFF, in->bytes, (size_t)count - 2) != dc_u16(in->bytes + count - 2))
        return -1;
    return count - 2;
}

static void put_stuffed(struct dc_out *out, uint8_t byte)
{
    if (byte)
        out->bytes[out->count++] = byte;
    if (!byte || out->count - out->code == 0xFF) {
        out->bytes[out->code] = (uint8_t)(out->count - out->code);
        out->code = out->count++;
    }
}

void dc_put8(struct dc_out *out, unsigned value)
{
    uint8_t byte = (uint8_t)(value & 0xFF);

    out->crc = dc_crc(out->crc, &byte, 1);
    put_stuffed(out, byte);
}

void dc_put16(struct dc_out *out, unsigned value)
{
    dc_put8(out, value);
    dc_put8(out, value >> 8);
}

void dc_put32(struct dc_out *out, uint32_t value)
{
    dc_put16(out, (unsigned)(value & 0xFFFF));
    dc_put16(out, (unsigned)(value >> 16));
}

void dc_put_text(struct dc_out *out, const char *text)
{
    size_t at;

    for (at = 0; at < DC_TEXT_LIMIT && text[at]; at++)
        dc_put8(out, (uint8_t)text[at]);
}

void dc_begin(struct dc_out *out, uint8_t type, uint8_t seq)
{
    out->crc = 0xFFFF;
    out->code = 0;
    out->count = 1;
    dc_put8(out, type);
    dc_put8(out, seq);
}

uint16_t dc_end(struct dc_out *out)
{
    uint16_t crc = out->crc;

    put_stuffed(out, (uint8_t)(crc & 0xFF));
    put_stuffed(out, (uint8_t)(crc >> 8));
    out->bytes[out->code] = (uint8_t)(out->count - out->code);
    out->bytes[out->count++] = 0;
    return out->count;
}
