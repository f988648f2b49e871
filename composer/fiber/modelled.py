"""From a make as mounted to its physics in SI and to its capability: the same way for every modelled kind."""

import math

import numpy as np

from composer.fiber import rates
from composer.fiber.bending import Bending
from composer.fiber.capability import Capability
from composer.fiber.coiling import Coiling
from composer.fiber.make import Make
from composer.fiber.mounting import Mounting
from composer.fiber.orifice import orifice
from composer.fiber.path import Path
from composer.fiber.pipe import Pipe
from composer.fiber.rates import Physics
from composer.fiber.work import ideal_force, reach


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
    full = rates.full_pressure(base.max_pressure_kPa, supply)
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
