/* See plant.h. */

#include "plant.h"

#include <stdio.h>
#include <string.h>

static int read_fiber(FILE *file, struct plant *plant)
{
    struct plant_fiber *fiber = &plant->fiber[plant->fibers];
    unsigned channel, drive, delay, point;

    if (plant->fibers >= DC_CHANNELS || fscanf(file, "%u %u %u %lf", &channel, &drive, &delay, &fiber->stroke) != 4 ||
        channel >= plant->channels || drive > DC_VALVE || delay >= PLANT_DELAY || !(fiber->stroke > 0.0))
        return 0;
    fiber->channel = channel;
    fiber->delay_steps = delay;
    plant->drive[channel] = (uint8_t)drive;
    for (point = 0; point < PLANT_POINTS; point++)
        if (fscanf(file, "%lf %lf %lf %lf", &fiber->fill[point], &fiber->exhaust[point], &fiber->share[point],
                   &fiber->air_L[point]) != 4)
            return 0;
    plant->fibers++;
    return 1;
}

const char *plant_read(struct plant *plant, const char *path)
{
    FILE *file = fopen(path, "r");
    char word[16];
    const char *wrong = NULL;
    unsigned version;

    if (!file)
        return "cannot be opened";
    memset(plant, 0, sizeof *plant);
    plant->stuck_at = -1;
    plant->leaked = 1.0;
    if (fscanf(file, "plant %u", &version) != 1 || version != 1)
        wrong = "is no file of plant parameters, version 1";
    else if (fscanf(file, " board %u %x %255[^\n]", &plant->channels, &plant->rig, plant->name) < 2 || !plant->channels ||
             plant->channels > DC_CHANNELS)
        wrong = "has no board, or one of more channels than this program is compiled for";
    else if (fscanf(file, " supply %lf %lf %lf %lf", &plant->full_kPa, &plant->least_kPa, &plant->kPa_per_L,
                    &plant->compressor_L_s) != 4)
        wrong = "has no supply";
    while (!wrong && fscanf(file, " %15s", word) == 1)
        if (strcmp(word, "fiber") || !read_fiber(file, plant))
            wrong = "has a fiber that is none";
    fclose(file);
    plant->supply_kPa = plant->full_kPa;
    if (!wrong)
        plant_step(plant, &(struct plant_wrongs){-1, -1, -1, 0});
    return wrong;
}

static double at_strain(const struct plant_fiber *fiber, const double *column)
{
    double place = fiber->strain / fiber->stroke * (PLANT_POINTS - 1);
    int below = place < 0.0 ? 0 : place >= PLANT_POINTS - 2 ? PLANT_POINTS - 2 : (int)place;

    return column[below] + (place - below) * (column[below + 1] - column[below]);
}

/* The strain that a set-point holds. */
static double held_by(const struct plant_fiber *fiber, double share)
{
    int point = 1;
    double rise, part;

    while (point < PLANT_POINTS - 1 && fiber->share[point] < share)
        point++;
    rise = fiber->share[point] - fiber->share[point - 1];
    part = rise > 0.0 ? (share - fiber->share[point - 1]) / rise : 1.0;
    part = part < 0.0 ? 0.0 : part > 1.0 ? 1.0 : part;
    return fiber->stroke * (point - 1 + part) / (PLANT_POINTS - 1);
}

/* Moves one fiber; returns the free air that it drew. */
static double move(struct plant_fiber *fiber, int drive, uint16_t number)
{
    double was_L = at_strain(fiber, fiber->air_L), drawn_L, wanted;
    double up = at_strain(fiber, fiber->fill) * PLANT_STEP_S, down = at_strain(fiber, fiber->exhaust) * PLANT_STEP_S;

    if (drive == DC_VALVE) {
        double opening = number < DC_SHUT ? (number - (double)DC_SHUT) / DC_SHUT : (number - (double)DC_SHUT) / (65535 - DC_SHUT);
        wanted = fiber->strain + opening * (opening > 0.0 ? up : down);
    } else {
        wanted = drive == DC_STRAIN ? fiber->stroke * number / 65535.0 : held_by(fiber, number / 65535.0);
    }
    if (wanted > fiber->strain + up)
        wanted = fiber->strain + up;
    if (wanted < fiber->strain - down)
        wanted = fiber->strain - down;
    fiber->strain = wanted < 0.0 ? 0.0 : wanted > fiber->stroke ? fiber->stroke : wanted;
    drawn_L = at_strain(fiber, fiber->air_L) - was_L;
    return drawn_L > 0.0 ? drawn_L : 0.0;
}

void plant_step(struct plant *plant, const struct plant_wrongs *wrongs)
{
    uint32_t n, channel;
    double tenths;

    plant->at = (plant->at + 1) % PLANT_DELAY;
    for (channel = 0; channel < plant->channels; channel++)
        plant->past[plant->at][channel] = __atomic_load_n(&plant->number[channel], __ATOMIC_RELAXED);
    if (wrongs->stuck >= 0) {
        if (plant->stuck_at < 0)
            plant->stuck_at = plant->past[plant->at][wrongs->stuck];
        plant->past[plant->at][wrongs->stuck] = (uint16_t)plant->stuck_at;
    }
    if (wrongs->leaking >= 0)
        plant->leaked *= 1.0 - 0.6931 * PLANT_STEP_S; /* half of what is held is lost in a second */
    plant->supply_kPa += plant->compressor_L_s * PLANT_STEP_S * plant->kPa_per_L;
    for (n = 0; n < plant->fibers; n++) {
        struct plant_fiber *fiber = &plant->fiber[n];
        uint32_t then = (plant->at + PLANT_DELAY - fiber->delay_steps) % PLANT_DELAY;
        double share;

        channel = fiber->channel;
        plant->supply_kPa -= move(fiber, plant->drive[channel], plant->past[then][channel]) * plant->kPa_per_L;
        share = fiber->strain / fiber->stroke * (wrongs->leaking == (int)channel ? plant->leaked : 1.0);
        if (wrongs->railed == (int)channel)
            share = 1.0;
        __atomic_store_n(&plant->reads[channel], (uint16_t)(share * 65535.0 + 0.5), __ATOMIC_RELAXED);
    }
    if (plant->supply_kPa > plant->full_kPa)
        plant->supply_kPa = plant->full_kPa;
    if (plant->supply_kPa < 0.0)
        plant->supply_kPa = 0.0;
    tenths = 10.0 * (wrongs->low_supply ? 0.8 * plant->least_kPa : plant->supply_kPa) + 0.5;
    __atomic_store_n(&plant->supply, (uint16_t)(tenths > 65534.0 ? 65534.0 : tenths), __ATOMIC_RELAXED);
}
