"""What the simulated board in C is told of a rig: the file of parameters that posix/plant.c reads."""

import numpy as np

from composer.drive.inverse import Inverse
from composer.limits.abilities import Abilities
from composer.rig.model import Rig
from composer.simulate.receiver import ANR_KPA
from player.wire.rules import Build

POINTS = 33
STEP_S = 0.002
MOST_DELAY = 255
DRIVES = ("pressure", "strain", "valve")


def plant_text(rig: Rig, abilities: Abilities, driver: str, build: Build) -> str:
    """The board `build` with the fibers of `driver` behind it, those whose channels it has.

    A fiber follows its set-point no faster than its rates at the strain where it is, after the response of valve and tube;
    which set-point holds which strain is the static curve, without friction. Strain 1, rates 1/s, air in L, kPa gauge.
    """
    supply = rig.supply
    compressor = supply.compressor_L_min / 60.0
    lines = [
        "plant 1",
        f"board {len(build.drives)} {build.rig or 0:x} {build.name}",
        f"supply {supply.max_receiver_kPa!r} {supply.min_pressure_kPa!r} {ANR_KPA / supply.receiver_L!r} {compressor!r}",
    ]
    share_of_stroke = np.linspace(0.0, 1.0, POINTS)
    strains = abilities.stroke[:, None] * share_of_stroke
    inverse = Inverse(rig, abilities, on=False)
    holding = np.maximum.accumulate(inverse.commands(strains, strains, strains, STEP_S), axis=1)
    delays = Inverse(rig, abilities).lead_s
    for n, fiber in enumerate(rig.fibers):
        if fiber.driver != driver or fiber.channel >= len(build.drives):
            continue
        drive, which = fiber.mounting.valve.drive, abilities.which[n]
        held = share_of_stroke if drive == "valve" else holding[n]
        columns = [
            np.interp(strains[n], abilities.strain[which], column[which])
            for column in (abilities.fill, abilities.exhaust, abilities.air_L)
        ]
        delay = min(round(float(delays[n]) / STEP_S), MOST_DELAY)
        lines.append(f"fiber {fiber.channel} {DRIVES.index(drive)} {delay} {float(abilities.stroke[n])!r}")
        for fill, exhaust, share, air_L in zip(columns[0], columns[1], held, columns[2], strict=True):
            lines.append(f"{fill:.9g} {exhaust:.9g} {share:.9g} {air_L:.9g}")
    return "\n".join(lines) + "\n"
