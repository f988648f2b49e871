/* Moves a plant in virtual time: argument: its file; input: lines "channel number steps"; written after each: the supply, then what
   every sensor reads. */

#include "posix/plant.h"

#include <stdio.h>

static struct plant plant;

int main(int count, char **words)
{
    const struct plant_wrongs none = {-1, -1, -1, 0};
    const char *wrong = count == 2 ? plant_read(&plant, words[1]) : "is missing";
    unsigned channel, number, steps;

    if (wrong) {
        puts(wrong);
        return 2;
    }
    while (scanf("%u %u %u", &channel, &number, &steps) == 3) {
        plant.number[channel] = (uint16_t)number;
        while (steps--)
            plant_step(&plant, &none);
        printf("%u", plant.supply);
        for (channel = 0; channel < plant.channels; channel++)
            printf(" %u", plant.reads[channel]);
        puts("");
    }
    return 0;
}
