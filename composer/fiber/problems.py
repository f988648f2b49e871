"""What cannot be about a fiber as it hangs: a load that it can't lift, no stroke, nothing that brings it back."""

import math

import numpy as np

from composer.fiber.bending import Bending
from composer.fiber.coiling import Coiling
from composer.fiber.make import Make
from composer.fiber.mounting import Mounting, Supply
from composer.fiber.rates import FULL_SHARE, full_pressure, worst_supply
from composer.fiber.work import filling_pressure

LEAST_STROKE = 1e-4
"""A usable strain below this is none."""

LEAST_RISE = 50.0
"""Rise of pressure in Pa from rest half way to its stop, below which a fiber could not be held in between, nor come back."""

Problem = tuple[str, str, str]
"""What cannot be about a fiber: the key to change, what was found, what was expected."""


def problems(make: Make | Bending | Coiling, mounting: Mounting) -> list[Problem]:
    """What cannot be about a make as mounted, as (key to change, what was found, what was expected).

    Asks for a few pressures only, so that thousands of fibers, each mounted in its own way, are soon seen through.
    """
    found = make.problems()
    if found:
        return found
    base = make if isinstance(make, Make) else make.base
    shape, friction = base.shape(), base.friction_fraction
    stop = shape.stop if isinstance(make, Make) else make.stop()
    load, full = mounting.load_N / mounting.bundle, full_pressure(base.max_pressure_kPa, mounting.supply)
    begins, moves, half_way = filling_pressure(shape, np.array([0.0, min(LEAST_STROKE, stop), stop / 2.0]), load, friction)
    if begins >= full:
        return [_too_heavy(base, mounting, begins, full)]
    if stop < LEAST_STROKE:
        return [_no_room(base, stop)]
    if moves > full:
        found = f"moving by 0.01 % of its length needs {moves / 1e3:.3g} kPa, and {_gets(base, mounting.supply, full)}"
        return [(_pressure_key(base, mounting.supply), found, _more_pressure(base, mounting.supply, moves))]
    if half_way - begins < LEAST_RISE:
        return [_no_return(begins, half_way)]
    return []


def _too_heavy(base: Make, mounting: Mounting, begins: float, full: float) -> Problem:
    """A load that the fiber cannot begin to move: fewer newtons, or what else would do."""
    lifts = full * (1.0 - base.friction_fraction) * base.shape().volume_slope(np.zeros(1))[0] / base.shape().length
    load = mounting.load_N
    found = f"a load of {load:g} N needs {begins / 1e3:.4g} kPa to begin to move, and {_gets(base, mounting.supply, full)}"
    expected = f"less than {lifts * mounting.bundle:.3g} N, or {_more_pressure(base, mounting.supply, begins)}"
    return "load_N", found, f"{expected}, or a bundle of {math.floor(load / lifts) + 1}"


def _no_room(base: Make, stop: float) -> Problem:
    """A shape that ends the motion where it begins."""
    own = {"contract": "braid_angle_deg", "extend": "sleeve_limit"}[base.direction]
    key = own if base.shape().stop < LEAST_STROKE else "constraint_length_mm"
    return key, f"its shape ends the motion at a strain of {stop:.2g}", f"a stroke of {LEAST_STROKE:g} at least"


def _no_return(begins: float, half_way: float) -> Problem:
    """A fiber that nothing brings back, or that jumps from rest to its stop."""
    expected = f"an elastomer that adds {LEAST_RISE:g} Pa at least on the first half of the way"
    if half_way < LEAST_RISE:
        found = f"neither elastomer nor load brings it back to rest: {half_way:.2g} Pa hold it half way"
        return "shear_modulus_kPa", found, f"{expected}, or a load"
    found = f"one pressure, {begins / 1e3:.4g} kPa, holds it at rest and half way, so that it cannot be held in between"
    return "shear_modulus_kPa", found, expected


def _pressure_key(base: Make, supply: Supply) -> str:
    """The key that sets that pressure."""
    if base.max_pressure_kPa * 1e3 <= FULL_SHARE * worst_supply(supply):
        return "max_pressure_kPa"
    return "pressure_kPa" if supply.pressure_kPa <= supply.min_pressure_kPa else "min_pressure_kPa"


def _gets(base: Make, supply: Supply, full: float) -> str:
    """How much it gets, and by which key."""
    key = _pressure_key(base, supply)
    return f"it gets {full / 1e3:.4g} kPa ({'' if key == 'max_pressure_kPa' else '95 % of '}{key})"


def _more_pressure(base: Make, supply: Supply, needed: float) -> str:
    """Every key that must be greater for a gauge pressure in Pa, with how much."""
    least = {
        "pressure_kPa": (supply.pressure_kPa, needed / FULL_SHARE),
        "min_pressure_kPa": (supply.min_pressure_kPa, needed / FULL_SHARE),
        "max_pressure_kPa": (base.max_pressure_kPa, needed),
    }
    short = {key: most for key, (has, most) in least.items() if has * 1e3 <= most}
    return " and ".join(f"{key} above {_rounded_up(most / 1e3):g}" for key, most in short.items())


def _rounded_up(value: float) -> float:
    """Three digits or more, never less than the value."""
    step = 10.0 ** min(math.floor(math.log10(value)) - 2, 0)
    return round(math.ceil(value / step) * step, 12)
