"""Benches made by hand: a fiber's equations solved in small steps, noise on top. Written from the physics, not from the code.

    python tests/composer/fit/synthetic.py OUT.csv

writes the demo bench.
"""

import sys

import numpy as np
from scipy.optimize import brentq

TRUE = {
    "rest_length_mm": 1200.0,
    "outer_diameter_mm": 5.0,
    "wall_mm": 0.8,
    "braid_angle_deg": 23.0,
    "shear_modulus_kPa": 250.0,
    "end_factor": 1.1,
    "friction_fraction": 0.04,
    "settle_ms": 15.0,
}
"""A reed of Estuary, as its rig file has it."""

LOAD_N = 4.0
PRESSURE_NOISE_KPA = 0.6
STRAIN_NOISE = 0.0008
HEAD = f"""\
# Invented: a bench that never was. A fiber of known make was worked out by its equations, and noise added to what sensors would
# have shown ({PRESSURE_NOISE_KPA:g} kPa and {STRAIN_NOISE:g} of strain, standard deviations). Nothing here was measured.
# What a ruler and a scale would tell of it:
# kind = "contractile"
# rest_length_mm = 1200
# outer_diameter_mm = 5.0
# wall_mm = 0.8
# load_N = 4
"""


def pressure_program(time):
    """Gauge pressure in kPa: slow triangles with a loop inside, then quick steps, as a bench would be driven."""
    corners = np.array(
        [
            [0.0, 0.0],
            [0.5, 0.0],
            [4.5, 400.0],
            [5.0, 400.0],
            [9.0, 0.0],
            [9.5, 0.0],
            [12.0, 250.0],
            [13.2, 130.0],
            [14.4, 250.0],
            [15.4, 350.0],
            [18.4, 50.0],
            [19.0, 50.0],
            [19.05, 300.0],
            [19.6, 300.0],
            [19.65, 120.0],
            [20.2, 120.0],
            [20.25, 400.0],
            [20.8, 400.0],
            [20.9, 200.0],
            [21.4, 200.0],
            [21.45, 330.0],
            [22.0, 330.0],
            [22.1, 0.0],
            [23.0, 0.0],
        ]
    )
    return np.interp(time, *corners.T)


def needed_kPa(e, true, load):
    """Pressure in kPa that holds a strain without friction: Tondu and Lopez's force, less a neo-Hookean tube's, is the load."""
    r, t = true["outer_diameter_mm"] / 2e3, true["wall_mm"] / 1e3
    a0, k, G = np.radians(true["braid_angle_deg"]), true["end_factor"], true["shear_modulus_kPa"]
    a, b = 3.0 / np.tan(a0) ** 2, 1.0 / np.sin(a0) ** 2
    pull_a_kPa = np.pi * r**2 * (a * (1.0 - k * e) ** 2 - b)
    along = 1.0 - k * e
    angle = np.arccos(along * np.cos(a0))
    around = np.sin(angle) / np.sin(a0)
    wall_area = np.pi * (r**2 - (r - t) ** 2)
    # Energy a length: A G/2 (along² + around² + 1/(along around)² − 3), its slope in `along` by the chain rule.
    slope_around = -along * np.cos(a0) ** 2 / np.sin(a0) ** 2 / around
    slope = (2.0 * along + 2.0 * around * slope_around) - 2.0 / (along * around) ** 3 * (around + along * slope_around)
    push = -wall_area * G / 2.0 * slope
    return (push + load / 1e3) / pull_a_kPa


def needed_by_a_sleeve_kPa(e, true, load):
    """The same of a tube in a pleated sleeve: P A = A_w G (l − l⁻³) + load, l = 1 + e."""
    r, t = true["outer_diameter_mm"] / 2e3, true["wall_mm"] / 1e3
    area, wall = np.pi * r**2, np.pi * (r**2 - (r - t) ** 2)
    return (wall * true["shear_modulus_kPa"] * (1.0 + e - (1.0 + e) ** -3) + load / 1e3) / area


def stop_of(true):
    """The strain at which a fiber ends its motion."""
    if "sleeve_limit" in true:
        return true["sleeve_limit"]
    return (1.0 - 1.0 / np.sqrt(3.0) / np.cos(np.radians(true["braid_angle_deg"]))) / true["end_factor"]


def held(pressure_kPa, true, load):
    """Strain that a pressure holds without friction, by root finding, through a fine table."""
    stop = stop_of(true)
    needed = needed_by_a_sleeve_kPa if "sleeve_limit" in true else needed_kPa
    levels = np.linspace(0.0, 1.2 * pressure_kPa.max() + 1.0, 1500)
    table = []
    for level in levels:
        if needed(0.0, true, load) >= level:
            table.append(0.0)
        elif needed(stop * (1.0 - 1e-7), true, load) <= level:
            table.append(stop)
        else:
            table.append(brentq(lambda e, level=level: needed(e, true, load) - level, 0.0, stop * (1.0 - 1e-7), xtol=1e-13))
    return lambda p: np.interp(p, levels, table)


def exact(true=TRUE, load=LOAD_N, program=pressure_program, until=23.0, rate=200, fine=20):
    """Times in s, pressures in kPa and strains as they are, without noise; `fine` steps of the equations between rows."""
    steps = round(until * rate) * fine
    time = np.arange(steps + 1) / (rate * fine)
    pressure = program(time)
    at = held(pressure, true, load)
    f, tau = true["friction_fraction"], true["settle_ms"] / 1e3
    way_in, way_out = at(pressure * (1.0 - f)), at(pressure * (1.0 + f))
    h = time[1]
    played = strain = 0.0
    out = np.empty(len(time))
    for n, (low, high) in enumerate(zip(way_in.tolist(), way_out.tolist(), strict=True)):
        played = min(max(played, low), high)
        # Implicit Euler: tau e' = played − e.
        strain = (strain + h / tau * played) / (1.0 + h / tau) if tau > 0.0 else played
        out[n] = strain
    return time[::fine], pressure[::fine], out[::fine]


def noisy(clean, seed, pressure_noise=PRESSURE_NOISE_KPA, strain_noise=STRAIN_NOISE):
    """What sensors would have shown."""
    time, pressure, strain = clean
    rng = np.random.default_rng(seed)
    return (
        time,
        pressure + pressure_noise * rng.standard_normal(len(time)),
        strain + strain_noise * rng.standard_normal(len(time)),
    )


def text(bench, head=""):
    """The bench as a file."""
    rows = "".join(f"{t:.3f},{p:.2f},{e:.5f}\n" for t, p, e in zip(*bench, strict=True))
    return head + "time_s,pressure_kPa,strain\n" + rows


def demo():
    """The demo bench, head and all."""
    return text(noisy(exact(), 20), HEAD)


if __name__ == "__main__":
    with open(sys.argv[1], "w", encoding="utf-8", newline="\n") as file:
        file.write(demo())
