"""The strain that a make of fiber would have shown on a bench: virtual work, the play of friction, the lag of elastomer."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.fiber.work import Kinematics, filling_pressure
from composer.fit.bench import Bench
from composer.fit.smooth import levelled, noise, smoothed, turns

Array = NDArray[np.float64]
Index = NDArray[np.int64]

POINTS = 1024
"""Strains in a table."""


@dataclass(frozen=True, slots=True, eq=False)
class Drive:
    """What drove the fiber on the bench, made ready once for many parameter sets.

    time: (N,) s; pressure: (N,) Pa gauge, its noise smoothed; load: N, or (N,) N where it was measured
    turn: (K,) rows where the pressure turns, the first row among them; stretch: (N,) which of them each row comes after
    first: strain measured at the start, from the first few rows
    """

    time: Array
    pressure: Array
    load: float | Array
    turn: Index
    stretch: Index
    first: float


def drive_of(bench: Bench, load: float) -> Drive:
    """The drive of a bench; `load` in N where the bench has no force of its own."""
    pressure = smoothed(bench.pressure)
    # Noise by itself must turn nowhere; turns below a thousandth of the swing change nothing.
    least = max(5.0 * noise(bench.pressure), 1e-3 * float(np.ptp(pressure)))
    turn = turns(pressure, least)
    pressure = levelled(pressure, turn, noise(bench.pressure))
    stretch = np.searchsorted(turn, np.arange(bench.rows), side="left") - 1
    force: float | Array = load if bench.force is None else np.maximum(smoothed(bench.force), 0.0)
    return Drive(bench.time, pressure, force, turn, np.maximum(stretch, 0), float(np.median(bench.strain[:3])))


def strain_on(drive: Drive, shape: Kinematics, stop: float, friction: float, settle: float) -> Array:
    """The strain (N,) of a fiber of that shape under that drive; `friction` a share of ideal force, `settle` in s."""
    edge_in, edge_out = edges(drive, shape, stop, friction)
    return lagged(drive.time, played(drive, edge_in, edge_out), settle)


def edges(drive: Drive, shape: Kinematics, stop: float, friction: float) -> tuple[Array, Array]:
    """Strains (N,) that each row's pressure and load hold on the way in and on the way out.

    (1 − f) P V' = W' + F L0 on the way in, (1 + f) on the way out: the same function of (1 ∓ f) P.
    """
    top = stop * (1.0 - 1e-9)
    if isinstance(drive.load, float):
        strain = np.linspace(0.0, top, POINTS)
        needs = filling_pressure(shape, strain, drive.load, 0.0)
        return (
            np.interp(drive.pressure * (1.0 - friction), needs, strain),
            np.interp(drive.pressure * (1.0 + friction), needs, strain),
        )
    return (
        _held(drive.pressure * (1.0 - friction), drive.load, shape, top),
        _held(drive.pressure * (1.0 + friction), drive.load, shape, top),
    )


def _held(pressure: Array, load: Array, shape: Kinematics, top: float) -> Array:
    """The strain (N,) whose needed pressure is the given one, each row under a load of its own.

    What is needed is linear in the load, and rises with strain: its cell is found by halving, in tables of both parts.
    """
    strain = np.linspace(0.0, top, POINTS)
    own = filling_pressure(shape, strain, 0.0, 0.0)
    per_newton = filling_pressure(shape, strain, 1.0, 0.0) - own
    low = np.zeros(len(pressure), dtype=np.int64)
    high = np.full(len(pressure), POINTS - 1)
    while np.any(high - low > 1):
        middle = (low + high) // 2
        reached = own[middle] + load * per_newton[middle] <= pressure
        low, high = np.where(reached, middle, low), np.where(reached, high, middle)
    begin, end = own[low] + load * per_newton[low], own[high] + load * per_newton[high]
    share = np.clip((pressure - begin) / np.maximum(end - begin, 1e-300), 0.0, 1.0)
    return strain[low] + share * (strain[high] - strain[low])


def played(drive: Drive, edge_in: Array, edge_out: Array) -> Array:
    """Strain (N,) after dry friction: the play operator, which remembers what it had at each turn of the pressure.

    Between turns the pressure goes one way, so each row depends on the last turn alone: noise that is left does not ratchet.
    """
    at_turn = np.empty(len(drive.turn))
    now = drive.first
    for number, row in enumerate(drive.turn):
        now = min(max(now, edge_in[row]), edge_out[row])
        at_turn[number] = now
    return np.minimum(np.maximum(at_turn[drive.stretch], edge_in), edge_out)


def lagged(time: Array, strain: Array, settle: float) -> Array:
    """The lag of elastomer and braid (Kelvin and Voigt), settled at the first row; exact for a strain that goes straight
    from row to row.
    """
    if settle < 1e-9:
        return strain
    h = np.diff(time)
    keeps = np.exp(-h / settle)
    behind = settle * np.diff(strain) / h
    # e' = p' − b + (e − p + b) k, written for d = e − p, so that a step is one product and one sum.
    adds = (behind * (keeps - 1.0)).tolist()
    d = 0.0
    apart = [d]
    for keep, add in zip(keeps.tolist(), adds, strict=True):
        d = d * keep + add
        apart.append(d)
    return strain + np.array(apart)
