"""From a make as mounted to its physics in SI and to its capability: the same way for every modelled kind."""

import math
from typing import Any

import numpy as np

from composer.fiber import rates
from composer.fiber.bending import Bending
from composer.fiber.capability import Capability
from composer.fiber.coiling import Coiling
from composer.fiber.make import Make
from composer.fiber.mounting import Mounting, Supply
from composer.fiber.orifice import orifice
from composer.fiber.path import Path
from composer.fiber.pipe import Pipe
from composer.fiber.rates import Physics
from composer.fiber.work import exhausting_pressure, filling_pressure, ideal_force, reach

FULL_SHARE = 0.95
"""Share of the worst supply at which a stroke is usable (rig-file.md)."""

LEAST_STROKE = 1e-4
"""A usable strain below this is none."""

LEAST_RETURN = 50.0
"""Pressure in Pa, half way to its stop, below which a fiber would never come back to rest."""


def physics_of(make: Make | Bending | Coiling, mounting: Mounting) -> Physics:
    """The fiber as mounted, in SI; its stroke is 0 where it cannot lift its load."""
    base = make if isinstance(make, Make) else make.base
    stop = base.shape().stop if isinstance(make, Make) else make.stop()
    shape = base.shape()
    supply, valve = mounting.supply, mounting.valve
    T = supply.temperature_C + 273.15
    pipes = (
        Pipe(mounting.tube_bore_mm * 1e-3, mounting.tube_length_mm * 1e-3),
        # Half of the fiber's own bore; of a bundle, so many side by side.
        Pipe(shape.bore, shape.length * mounting.series / 2.0, mounting.bundle),
    )
    full = _full(base, supply)
    load = mounting.load_N / mounting.bundle
    return Physics(
        shape=shape,
        path=Path(orifice(valve.C_dm3_s_bar, valve.b), pipes, T),
        load=load,
        friction=base.friction_fraction,
        settle=base.settle_ms * 1e-3,
        count=mounting.bundle * mounting.series,
        stop=stop,
        stroke=min(reach(shape, full, load, base.friction_fraction), stop),
        full=full,
        limit=base.max_pressure_kPa * 1e3,
        n=supply.polytropic,
        ambient=supply.ambient_kPa * 1e3,
        water=supply.medium == "water",
    )


def capability(make: Make | Bending | Coiling, mounting: Mounting) -> Capability:
    """What a modelled fiber can do where it hangs: stroke, rate tables, air and force from its make, tube, valve and load."""
    physics = physics_of(make, mounting)
    base = make if isinstance(make, Make) else make.base
    strain = np.linspace(0.0, physics.stroke, rates.POINTS)
    # The rate is taken at the ends of the held ranges, not at their insides, where an unloaded fiber would never arrive.
    low, high = rates.HELD_SHARE * physics.stroke, (1.0 - rates.HELD_SHARE) * physics.stroke
    fill, _ = rates.fastest(physics, np.minimum(strain, high), rates.worst_supply(mounting.supply))
    _, exhaust = rates.fastest(physics, np.maximum(strain, low), rates.worst_supply(mounting.supply))
    at_rest = np.zeros(1)
    force = (1.0 - physics.friction) * ideal_force(physics.shape, at_rest, np.array([physics.full]))[0]
    return Capability(
        stroke=physics.stroke,
        direction=base.direction,
        length_mm=base.rest_length_mm * mounting.series,
        turn_deg=None if isinstance(make, Make) else make.turn_deg() * mounting.series,
        strain=strain,
        fill=fill,
        exhaust=exhaust,
        accel=math.inf,
        air_L=rates.drawn(physics, strain),
        force_N=float(force) * mounting.bundle,
        held_below=low,
        held_above=high,
        physics=physics,
    )


def problems(make: Make | Bending | Coiling, mounting: Mounting) -> list[tuple[str, str, str]]:
    """What cannot be about a make as mounted, as (key to change, what was found, what was expected).

    Asks for a few pressures only, so that thousands of fibers, each mounted in its own way, are soon seen through.
    """
    found = make.problems()
    if found:
        return found
    base = make if isinstance(make, Make) else make.base
    shape, friction = base.shape(), base.friction_fraction
    stop = shape.stop if isinstance(make, Make) else make.stop()
    load, full = mounting.load_N / mounting.bundle, _full(base, mounting.supply)
    begins, moves = filling_pressure(shape, np.array([0.0, min(LEAST_STROKE, stop)]), load, friction)
    if begins >= full:
        return [_too_heavy(base, mounting, begins, full)]
    if moves > full or stop < LEAST_STROKE:
        return [_no_stroke(make, base, mounting, full, stop)]
    returns = exhausting_pressure(shape, np.array([stop / 2.0]), load, friction)[0]
    if returns < LEAST_RETURN:
        found = f"neither elastomer nor load brings it back to rest: {returns:.2g} Pa hold it half way"
        return [("shear_modulus_kPa", found, f"an elastomer, or a load, that takes {LEAST_RETURN:g} Pa at least")]
    return []


def _too_heavy(base: Make, mounting: Mounting, begins: float, full: float) -> tuple[str, str, str]:
    """A load that the fiber cannot begin to move: fewer newtons, or what else would do."""
    lifts = full * (1.0 - base.friction_fraction) * base.shape().volume_slope(np.zeros(1))[0] / base.shape().length
    load = mounting.load_N
    found = f"a load of {load:g} N needs {begins / 1e3:.4g} kPa to begin to move, and {_gets(base, mounting.supply, full)}"
    key = _pressure_key(base, mounting.supply)
    others = f"more {key}, or a bundle of {math.floor(load / lifts) + 1}"
    return "load_N", found, f"less than {lifts * mounting.bundle:.3g} N, {others}"


def _no_stroke(make: Any, base: Make, mounting: Mounting, full: float, stop: float) -> tuple[str, str, str]:
    """A fiber that moves by next to nothing, by its shape or by its pressure."""
    if stop < LEAST_STROKE:
        own = {"contract": "braid_angle_deg", "extend": "sleeve_limit"}[base.direction]
        key = own if base.shape().stop < LEAST_STROKE else "constraint_length_mm"
        return key, f"its shape ends the motion at a strain of {stop:.2g}", "a make that moves by 0.01 % of its length at least"
    found = f"no stroke is left: {_gets(base, mounting.supply, full)}"
    return _pressure_key(base, mounting.supply), found, "what moves it by 0.01 % of its length at least"


def _full(base: Make, supply: Supply) -> float:
    """The gauge pressure in Pa at which a stroke is usable."""
    return min(FULL_SHARE * rates.worst_supply(supply), base.max_pressure_kPa * 1e3)


def _pressure_key(base: Make, supply: Supply) -> str:
    """The key that sets that pressure."""
    if base.max_pressure_kPa * 1e3 <= FULL_SHARE * rates.worst_supply(supply):
        return "max_pressure_kPa"
    return "pressure_kPa" if supply.pressure_kPa <= supply.min_pressure_kPa else "min_pressure_kPa"


def _gets(base: Make, supply: Supply, full: float) -> str:
    """How much it gets, and by which key."""
    key = _pressure_key(base, supply)
    return f"it gets {full / 1e3:.4g} kPa ({'' if key == 'max_pressure_kPa' else '95 % of '}{key})"
