"""What each fiber of a rig can do where it hangs, as a table for a terminal and as JSON."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from composer.limits.abilities import Abilities
from composer.limits.tables import travel_time_s
from composer.rig.model import Rig

HEADINGS = ("fibers", "type", "valve", "channel", "stroke", "", "force", "fill", "exhaust", "air")
UNITS = ("", "", "", "", "%", "", "N", "s", "s", "mL")
LEFT = 3
"""Columns from the left that are words, the others being numbers."""


@dataclass(frozen=True, slots=True)
class Run:
    """Like fibers on end, `first` to before `last` in the rig's order, on channels on end of one driver."""

    first: int
    last: int


def runs_of(rig: Rig, abilities: Abilities) -> tuple[Run, ...]:
    """The rig's fibers in runs that share everything that the table says, named one after the other."""
    runs: list[Run] = []
    for index, fiber in enumerate(rig.fibers):
        before = rig.fibers[index - 1]
        like = (
            index > 0
            and abilities.which[index] == abilities.which[index - 1]
            and fiber.type.name == before.type.name
            and fiber.driver == before.driver
            and fiber.channel == before.channel + 1
            and _follows(before.name, fiber.name)
        )
        runs[-1:] = [Run(runs[-1].first, index + 1)] if like else [*runs[-1:], Run(index, index + 1)]
    return tuple(runs)


def name_of(rig: Rig, run: Run) -> str:
    """The run as a score would name it."""
    first, last = rig.fibers[run.first].name, rig.fibers[run.last - 1].name
    return first if run.last - run.first == 1 else f"{first}-{last.rpartition('.')[2]}"


def as_text(path: str, rig: Rig, abilities: Abilities) -> str:
    """The table for a terminal, a row for each run of like fibers, and what must be known to read it."""
    runs = runs_of(rig, abilities)
    first = np.array([run.first for run in runs])
    rest, full = np.zeros(len(runs)), abilities.stroke[first]
    fill, exhaust = travel_time_s(abilities, first, rest, full), travel_time_s(abilities, first, full, rest)
    rows = [_row(rig, abilities, run, fill[n], exhaust[n]) for n, run in enumerate(runs)]
    count = len(rig.fibers)
    lines = [
        f"{path}: {rig.name}, {count} fiber{'' if count == 1 else 's'}, fingerprint {rig.fingerprint:08x}",
        _supply(rig),
        "",
    ]
    lines += _table([HEADINGS, UNITS, *rows])
    air = "the water of one fill" if rig.supply.medium == "water" else "of one fill, as free air (ANR)"
    lines += ["", f"fill, exhaust: a full stroke as fast as it goes; force: at rest, at full pressure; air: {air}"]
    return "\n".join([*lines, *_held(rig, abilities, runs)])


def as_json(path: str, rig: Rig, abilities: Abilities) -> dict[str, Any]:
    """The report for programs."""
    tables = [
        [[_short(value) for value in row] for row in zip(one.strain, one.fill, one.exhaust, strict=True)]
        for one in abilities.capabilities
    ]
    fibers = []
    for index, fiber in enumerate(rig.fibers):
        which = int(abilities.which[index])
        able = abilities.capabilities[which]
        fibers.append(
            {
                "name": fiber.name,
                "type": fiber.type.name,
                "valve": fiber.mounting.valve.name,
                "channel": fiber.channel,
                "stroke": _short(able.stroke),
                "stroke_mm": _short(able.stroke * able.length_mm),
                "force_N": None if able.force_N is None else _short(able.force_N),
                "air_L": _short(able.air_L[-1]),
                "rates": tables[which],
            }
        )
    return {"rig": path, "fingerprint": f"{rig.fingerprint:08x}", "fibers": fibers}


def _short(value: float) -> float:
    """Nine digits are more than any fiber keeps."""
    return float(f"{value:.9g}")


def _follows(before: str, name: str) -> bool:
    """Whether names are reed.3 and reed.4."""
    stem, _, number = name.rpartition(".")
    was, _, last = before.rpartition(".")
    return bool(stem) and stem == was and number.isdecimal() and last.isdecimal() and int(number) == int(last) + 1


def _row(rig: Rig, abilities: Abilities, run: Run, fill_s: float, exhaust_s: float) -> tuple[str, ...]:
    fiber, able = rig.fibers[run.first], abilities.capabilities[abilities.which[run.first]]
    channel = str(fiber.channel) if run.last - run.first == 1 else f"{fiber.channel}-{fiber.channel + run.last - run.first - 1}"
    if len(rig.drivers) > 1:
        channel = f"{fiber.driver} {channel}"
    way = f"{able.stroke * able.length_mm:.1f} mm" if able.turn_deg is None else f"{able.stroke * able.turn_deg:.0f}°"
    return (
        name_of(rig, run),
        fiber.type.name,
        fiber.mounting.valve.name,
        channel,
        f"{able.stroke * 100.0:.1f}",
        way,
        "-" if able.force_N is None else f"{able.force_N:.1f}",
        _seconds(fill_s),
        _seconds(exhaust_s),
        f"{able.air_L[-1] * 1e3:.1f}",
    )


def _seconds(value: float) -> str:
    return f"{value:.2f}" if value < 100.0 else f"{value:.0f}"


def _supply(rig: Rig) -> str:
    supply = rig.supply
    what = (
        f"water at {supply.pressure_kPa:g} kPa, pump {supply.compressor_L_min:g} L/min"
        if supply.medium == "water"
        else f"air at {supply.pressure_kPa:g} kPa, receiver {supply.receiver_L:g} L from {supply.max_receiver_kPa:g} down to "
        f"{supply.min_pressure_kPa:g} kPa, compressor {supply.compressor_L_min:g} L/min"
    )
    least = min(supply.pressure_kPa, supply.min_pressure_kPa)
    return f"supply: {what}; strokes and rates are promised at {least:g} kPa"


def _table(rows: Sequence[Sequence[str]]) -> Iterable[str]:
    wide = [max(len(row[column]) for row in rows) for column in range(len(HEADINGS))]
    for row in rows:
        cells = [
            text.ljust(width) if n < LEFT else text.rjust(width) for n, (text, width) in enumerate(zip(row, wide, strict=True))
        ]
        yield "  ".join(cells).rstrip()


def _held(rig: Rig, abilities: Abilities, runs: Sequence[Run]) -> list[str]:
    """Where the tables keep a rate that would die away, and so how much of the times is not the fiber's own."""
    types = dict.fromkeys(
        rig.fibers[run.first].type.name
        for run in runs
        if abilities.capabilities[abilities.which[run.first]].physics is not None
    )
    if not types:
        return []
    return [
        f"{', '.join(types)}: from their make, as mounted. The last 2 % of stroke on either way keep the rate from before:",
        "exhaust below 2 % of stroke, fill above 98 %, where the pressure that drives the flow dies away",
    ]
