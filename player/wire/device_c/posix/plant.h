/* The fibers behind a simulated board: each follows its set-point no faster than its rates, read from a file of parameters. */

#ifndef DRAWCORD_PLANT_H
#define DRAWCORD_PLANT_H

#include "device.h"

#define PLANT_POINTS 33 /* rows of a fiber's table, evenly over its stroke */
#define PLANT_DELAY 256 /* longest response of a valve, in steps */
#define PLANT_STEP_S 0.002

/* What can be wrong with a plant; channel -1: nothing. */
struct plant_wrongs {
    int stuck, railed, leaking, low_supply;
};

struct plant_fiber {
    uint32_t channel, delay_steps;
    double stroke;
    double fill[PLANT_POINTS], exhaust[PLANT_POINTS]; /* fastest rates, 1/s */
    double share[PLANT_POINTS];                       /* the set-point that holds each strain, rising */
    double air_L[PLANT_POINTS];                       /* free air drawn from rest */
    double strain;
};

/* What the file says of the board, and the fibers. `number` is what channels are set to, `reads` and `supply` what sensors read:
   these are handed from thread to thread, a number at a time. */
struct plant {
    char name[DC_TEXT_LIMIT + 1];
    uint32_t channels, rig, fibers;
    uint8_t drive[DC_CHANNELS];
    struct plant_fiber fiber[DC_CHANNELS];
    double supply_kPa, full_kPa, least_kPa, kPa_per_L, compressor_L_s, leaked;
    uint16_t past[PLANT_DELAY][DC_CHANNELS];
    uint32_t at;
    uint16_t number[DC_CHANNELS], reads[DC_CHANNELS], supply;
    int stuck_at;
};

/* Reads the file; returns NULL, or what is wrong with it. */
const char *plant_read(struct plant *plant, const char *path);

/* Lets PLANT_STEP_S pass. */
void plant_step(struct plant *plant, const struct plant_wrongs *wrongs);

#endif
