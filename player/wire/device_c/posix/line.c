/* See line.h. */

#define _XOPEN_SOURCE 700

#include "line.h"

#include <fcntl.h>
#include <poll.h>
#include <pthread.h>
#include <stdlib.h>
#include <string.h>
#include <termios.h>
#include <unistd.h>

#define ROOM 65536u  /* what nobody reads is dropped beyond this, as a UART would */
#define PARTS 1024u
#define CUT_WITHIN 48u /* a frame that is cut off ends within so many bytes, so that short ones are met too */

/* So many bytes that leave together. */
struct part {
    int64_t leaves_ns;
    size_t count;
};

static pthread_mutex_t lock;
static struct line_wrongs wrongs;
static int master = -1, wake[2];
static uint8_t bytes_of[ROOM];
static size_t first_byte, byte_count;
static struct part part_of[PARTS];
static size_t first_part, part_count;
static int forgotten; /* whether what `leaving` has copied is no longer in the ring */

/* One way of the line: its chance, and of a frame that is cut off, after how many bytes (0: whole), and how many have gone. */
struct way {
    uint32_t chance;
    size_t cut_at, gone;
    int runs_on;
};
static struct way in = {1, 0, 0, 0}, out = {2, 0, 0, 0};

/* Numbers by chance, always the same ones: G. Marsaglia, "Xorshift RNGs", Journal of Statistical Software 8(14), 2003. */
static uint32_t draw(uint32_t *chance, uint32_t below)
{
    *chance ^= *chance << 13;
    *chance ^= *chance >> 17;
    *chance ^= *chance << 5;
    return *chance % below;
}

/* Whether a byte is behind the place at which its frame is cut off; every other such frame runs into the next. */
static int cut_off(struct way *way, uint8_t byte)
{
    int lost;

    if (!way->gone++) {
        way->cut_at = (int)draw(&way->chance, 1000) < wrongs.cut ? 1 + draw(&way->chance, CUT_WITHIN) : 0;
        way->runs_on = (int)draw(&way->chance, 2);
    }
    lost = way->cut_at && way->gone >= way->cut_at && (byte || way->runs_on);
    if (!byte)
        way->gone = 0;
    return lost;
}

static size_t spoil(uint8_t *bytes, size_t count, struct way *way)
{
    int garbled = __atomic_load_n(&wrongs.garbles_later, __ATOMIC_RELAXED) ? 0 : wrongs.garbled;
    size_t at, kept = 0;

    if (!garbled && !wrongs.lost && !wrongs.cut)
        return count;
    for (at = 0; at < count; at++) {
        uint8_t byte = bytes[at];
        if (wrongs.cut && cut_off(way, byte))
            continue;
        if ((int)draw(&way->chance, 1000) < garbled)
            byte ^= (uint8_t)(1 + draw(&way->chance, 255));
        if ((int)draw(&way->chance, 1000) >= wrongs.lost)
            bytes[kept++] = byte;
    }
    return kept;
}

void line_garble(void)
{
    __atomic_store_n(&wrongs.garbles_later, 0, __ATOMIC_RELAXED);
}

const char *line_open(const struct line_wrongs *given)
{
    pthread_mutexattr_t inherits;
    struct termios raw;
    const char *path;
    int slave;

    wrongs = *given;
    pthread_mutexattr_init(&inherits);
    pthread_mutexattr_setprotocol(&inherits, PTHREAD_PRIO_INHERIT);
    pthread_mutex_init(&lock, &inherits);
    master = posix_openpt(O_RDWR | O_NOCTTY);
    if (master < 0 || grantpt(master) || unlockpt(master) || !(path = ptsname(master)))
        return NULL;
    /* Kept open, so that the terminal outlives the hosts that come and go. */
    slave = open(path, O_RDWR | O_NOCTTY);
    if (slave < 0 || tcgetattr(slave, &raw))
        return NULL;
    raw.c_iflag = 0;
    raw.c_oflag = 0;
    raw.c_lflag = 0;
    raw.c_cflag = CS8 | CREAD | CLOCAL;
    raw.c_cc[VMIN] = 1;
    raw.c_cc[VTIME] = 0;
    cfsetispeed(&raw, B38400);
    cfsetospeed(&raw, B38400);
    if (tcsetattr(slave, TCSANOW, &raw) || pipe(wake) || fcntl(master, F_SETFL, O_NONBLOCK) ||
        fcntl(wake[0], F_SETFL, O_NONBLOCK) || fcntl(wake[1], F_SETFL, O_NONBLOCK))
        return NULL;
    return path;
}

void line_wake(void)
{
    /* A pipe that is full wakes as well. */
    if (write(wake[1], "", 1) < 0)
        return;
}

void line_wait(int64_t now_ns, int64_t most_ns)
{
    struct pollfd on[2] = {{0, POLLIN, 0}, {0, POLLIN, 0}};
    uint8_t scrap[64];

    on[0].fd = master;
    on[1].fd = wake[0];
    pthread_mutex_lock(&lock);
    if (part_count) {
        int64_t leaves_ns = part_of[first_part].leaves_ns;
        if (leaves_ns <= now_ns)
            on[0].events |= POLLOUT;
        else if (leaves_ns - now_ns < most_ns)
            most_ns = leaves_ns - now_ns;
    }
    pthread_mutex_unlock(&lock);
    poll(on, 2, (int)((most_ns + 999999) / 1000000));
    while (read(wake[0], scrap, sizeof scrap) > 0)
        continue;
}

size_t line_read(uint8_t *bytes, size_t room, int64_t now_ns)
{
    ssize_t count = read(master, bytes, room);

    if (count <= 0)
        return 0;
    if (wrongs.echoes)
        line_put(bytes, (size_t)count, now_ns);
    return spoil(bytes, (size_t)count, &in);
}

void line_clear(void)
{
    pthread_mutex_lock(&lock);
    byte_count = part_count = 0;
    forgotten = 1;
    pthread_mutex_unlock(&lock);
}

void line_put(const uint8_t *bytes, size_t count, int64_t now_ns)
{
    uint8_t sent[4096];
    size_t at;

    if (count > sizeof sent)
        count = sizeof sent;
    memcpy(sent, bytes, count);
    pthread_mutex_lock(&lock);
    count = spoil(sent, count, &out);
    if (byte_count + count > ROOM || part_count == PARTS) {
        byte_count = part_count = 0;
        forgotten = 1;
    }
    for (at = 0; at < count; at++)
        bytes_of[(first_byte + byte_count++) % ROOM] = sent[at];
    if (count)
        part_of[(first_part + part_count++) % PARTS] = (struct part){now_ns + wrongs.late_ns, count};
    pthread_mutex_unlock(&lock);
}

/* The straight beginning of what may leave now, copied. */
static size_t leaving(uint8_t *bytes, size_t room, int64_t now_ns)
{
    size_t count = 0;

    pthread_mutex_lock(&lock);
    if (part_count && part_of[first_part].leaves_ns <= now_ns) {
        count = part_of[first_part].count;
        count = count > ROOM - first_byte ? ROOM - first_byte : count;
        count = count > room ? room : count;
        memcpy(bytes, bytes_of + first_byte, count);
    }
    forgotten = 0;
    pthread_mutex_unlock(&lock);
    return count;
}

static void has_left(size_t count)
{
    pthread_mutex_lock(&lock);
    if (!forgotten) {
        first_byte = (first_byte + count) % ROOM;
        byte_count -= count;
        part_of[first_part].count -= count;
        if (!part_of[first_part].count) {
            first_part = (first_part + 1) % PARTS;
            part_count--;
        }
    }
    pthread_mutex_unlock(&lock);
}

void line_send(int64_t now_ns)
{
    uint8_t bytes[4096];
    size_t count;

    /* Written without the lock: whoever puts never waits for the system. */
    while ((count = leaving(bytes, sizeof bytes, now_ns)) > 0) {
        ssize_t done = write(master, bytes, count);
        if (done <= 0)
            break;
        has_left((size_t)done);
    }
}
