/* Plays a script of inputs to a device in virtual time and writes down all that it does. All numbers little-endian.

   Script: op u8, then
     0 a new device: now u32, channels u16, senses u8, knows_rig u8, rig u32, room u16, drives u8 x channels, name: length u8, bytes
     1 bytes came: now u32, length u16, bytes
     2 time passed: now u32
     3 found a fault: now u32, code u8, channel u16, text: length u8, bytes
     4 CRC of bytes: length u16, bytes
     5 unstuff bytes: length u16, bytes
     6 frame bytes (type, seq, body): length u16, bytes
   Written: 'V' channel u16 value u16; 'S' length u16, frame; and after each of 0 to 3 the events, each with its letter ('A' arrival u32
   due u32 first u16 count u16 late u8; 'C' was u8 now u8 why: length u8, bytes; 'T' code u8 channel u16 text: length u8, bytes), then
   'N' status u8 queued u16 late u32 bad u32 wait u32. 4: 'R' crc u16. 5: 'U' length i32, bytes. 6: 'S'. */

#include "device.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static struct dc_device device;
static struct dc_board board;
static uint8_t drives[DC_CHANNELS];
static char name[256];
static uint8_t events[1 << 20];
static size_t event_count;

static void put(uint8_t *to, size_t *count, unsigned size, uint32_t value)
{
    while (size--) {
        to[(*count)++] = (uint8_t)(value & 0xFF);
        value >>= 8;
    }
}

static void out(unsigned size, uint32_t value)
{
    uint8_t bytes[4];
    size_t count = 0;
    put(bytes, &count, size, value);
    fwrite(bytes, 1, count, stdout);
}

static void out_frame(void *context, const uint8_t *bytes, uint16_t count)
{
    (void)context;
    out(1, 'S');
    out(2, count);
    fwrite(bytes, 1, count, stdout);
}

static void set_valve(void *context, uint16_t channel, uint16_t value)
{
    (void)context;
    out(1, 'V');
    out(2, channel);
    out(2, value);
}

/* What the simulated sensors of both devices under test read. */
static uint16_t strain(void *context, uint16_t channel)
{
    (void)context;
    return (uint16_t)(channel * 257u % 65536u);
}

static uint16_t supply(void *context)
{
    (void)context;
    return 4321;
}

static void put_text(const char *text)
{
    size_t length = strlen(text);
    put(events, &event_count, 1, (uint32_t)length);
    memcpy(events + event_count, text, length);
    event_count += length;
}

static void applied(void *context, uint32_t arrival_us, uint32_t due_us, uint16_t first, uint16_t count, int late)
{
    (void)context;
    put(events, &event_count, 1, 'A');
    put(events, &event_count, 4, arrival_us);
    put(events, &event_count, 4, due_us);
    put(events, &event_count, 2, first);
    put(events, &event_count, 2, count);
    put(events, &event_count, 1, (uint32_t)late);
}

static void changed(void *context, enum dc_status was, enum dc_status now, const char *why)
{
    (void)context;
    put(events, &event_count, 1, 'C');
    put(events, &event_count, 1, was);
    put(events, &event_count, 1, now);
    put_text(why);
}

static void told(void *context, enum dc_fault code, uint16_t channel, const char *text)
{
    (void)context;
    put(events, &event_count, 1, 'T');
    put(events, &event_count, 1, code);
    put(events, &event_count, 2, channel);
    put_text(text);
}

static uint32_t in(unsigned size)
{
    uint32_t value = 0;
    unsigned shift;
    for (shift = 0; shift < 8 * size; shift += 8) {
        int byte = getchar();
        if (byte == EOF)
            exit(3);
        value |= (uint32_t)byte << shift;
    }
    return value;
}

/* Exactly as large as what is in it, so that a step beyond its end is seen. */
static uint8_t *in_bytes(size_t count, size_t more)
{
    uint8_t *bytes = malloc(count + more ? count + more : 1);
    if (!bytes || fread(bytes, 1, count, stdin) != count)
        exit(3);
    return bytes;
}

static void begin(void)
{
    uint32_t now = in(4), senses;
    uint16_t length;

    memset(&board, 0, sizeof board);
    board.channels = (uint16_t)in(2);
    senses = in(1);
    board.knows_rig = (int)in(1);
    board.rig = in(4);
    length = (uint16_t)in(2);
    if (fread(drives, 1, board.channels, stdin) != board.channels)
        exit(3);
    memset(name, 0, sizeof name);
    {
        size_t letters = in(1);
        if (fread(name, 1, letters, stdin) != letters)
            exit(3);
    }
    board.name = name;
    board.drive = drives;
    board.set_valve = set_valve;
    board.send = out_frame;
    board.strain = senses & 1 ? strain : NULL;
    board.supply = senses & 2 ? supply : NULL;
    board.applied = applied;
    board.changed = changed;
    board.told = told;
    if (!dc_start(&device, &board, now))
        exit(4);
    device.room = length;
}

int main(void)
{
    int op;

    while ((op = getchar()) != EOF) {
        uint32_t now = 0;
        size_t length;
        uint8_t *bytes;

        event_count = 0;
        if (op == 0) {
            begin();
            now = device.clock_us;
        } else if (op == 1) {
            now = in(4);
            length = in(2);
            bytes = in_bytes(length, 0);
            dc_receive(&device, bytes, length, now);
            free(bytes);
        } else if (op == 2) {
            now = in(4);
            dc_advance(&device, now);
        } else if (op == 3) {
            enum dc_fault code;
            uint16_t channel;
            now = in(4);
            code = (enum dc_fault)in(1);
            channel = (uint16_t)in(2);
            length = in(1);
            bytes = in_bytes(length, 1);
            bytes[length] = 0;
            dc_fail(&device, code, channel, (const char *)bytes, now);
            free(bytes);
        } else {
            length = in(2);
            bytes = in_bytes(length, 0);
            if (op == 4) {
                out(1, 'R');
                out(2, dc_crc(0xFFFF, bytes, length));
            } else if (op == 5) {
                int size = dc_unstuff(bytes, length);
                out(1, 'U');
                out(4, (uint32_t)size);
                if (size > 0)
                    fwrite(bytes, 1, (size_t)size, stdout);
            } else {
                size_t at;
                dc_begin(&device.out, bytes[0], bytes[1]);
                for (at = 2; at < length; at++)
                    dc_put8(&device.out, bytes[at]);
                out_frame(NULL, device.out.bytes, dc_end(&device.out));
            }
            free(bytes);
            continue;
        }
        fwrite(events, 1, event_count, stdout);
        out(1, 'N');
        out(1, device.status);
        out(2, device.queued);
        out(4, device.late);
        out(4, device.bad);
        out(4, dc_wait_us(&device, now));
    }
    return 0;
}
