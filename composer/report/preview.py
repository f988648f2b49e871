"""What a preview tells: as JSON, as a few sentences, as rows of a table."""

from collections.abc import Callable, Iterator, Sequence
from typing import Any

import numpy as np

from composer.limits.abilities import Abilities
from composer.motion import segments_at
from composer.simulate.hits import Landings
from composer.simulate.run import Block
from composer.tracks import Tracks

UNSEEN = 0.005
"""An error below this share of the stroke is not worth a sentence."""


def as_json(
    found: Landings,
    tracks: Tracks,
    abilities: Abilities,
    say_place: Callable[[float], str],
    names: Sequence[str],
    head: dict[str, Any],
) -> dict[str, Any]:
    """The report as JSON has it: `head`, then the largest error, and error and lateness at every hit.

    say_place: bar and count of an instant in s
    error is strain less strain wanted (1), error_of_stroke its share of the fiber's stroke; late_s is null where a fiber
    never did 95 % of its move before the move after the next.
    """
    hits = [
        {
            "place": say_place(float(time)),
            "time_s": round(float(time), 9),
            "fiber": names[fiber],
            "line": int(tracks.line[segment]),
            "error": _tidy(error),
            "error_of_stroke": _tidy(error / abilities.stroke[fiber]),
            "late_s": None if np.isnan(late) else round(float(late), 6),
        }
        for segment, fiber, time, error, late in zip(
            found.segment, found.fiber, found.time_s, found.error, found.late_s, strict=True
        )
    ]
    return {**head, "largest": _largest(found, tracks, abilities, say_place, names), "hits": hits}


def _largest(
    found: Landings, tracks: Tracks, abilities: Abilities, say_place: Callable[[float], str], names: Sequence[str]
) -> dict[str, Any] | None:
    if not tracks.fibers:
        return None
    fiber = found.largest_fiber
    segment = segments_at(tracks, np.array([found.largest_s]))[fiber, 0]
    return {
        "error": _tidy(found.largest),
        "error_of_stroke": _tidy(found.largest / abilities.stroke[fiber]),
        "fiber": names[fiber],
        "time_s": round(found.largest_s, 9),
        "place": say_place(found.largest_s),
        "line": int(tracks.line[segment]),
    }


def sentences(
    found: Landings,
    tracks: Tracks,
    abilities: Abilities,
    say_place: Callable[[float], str],
    names: Sequence[str],
    lowest_kPa: float,
) -> list[str]:
    """What a person should know first: the worst on the way, the worst at a hit, the supply."""
    told = []
    largest = _largest(found, tracks, abilities, say_place, names)
    if largest is None or largest["error_of_stroke"] < UNSEEN:
        told.append("Every fiber follows the score all the way.")
    else:
        line = f" (line {largest['line']})" if largest["line"] else ""
        told.append(
            f"The largest miss: {largest['fiber']} is {_share(largest['error_of_stroke'])} of its stroke away from the score"
            f" at bar {_bar_count(largest['place'])}{line}."
        )
    share = np.abs(found.error) / abilities.stroke[found.fiber]
    bad = int(np.count_nonzero(share >= UNSEEN))
    if bad:
        worst = int(np.nanargmax(share))
        late = found.late_s[worst]
        how = "does not get there before it is called elsewhere" if np.isnan(late) else f"gets there {late:.2f} s late"
        told.append(
            f"{bad} of {len(share)} landings miss. The worst: {names[found.fiber[worst]]} at bar"
            f" {_bar_count(say_place(float(found.time_s[worst])))} is {_share(share[worst])} of its stroke short of its"
            f" target and {how}."
        )
    elif len(share):
        told.append(f"All {len(share)} landings are met.")
    told.append(f"The receiver is never below {lowest_kPa:.0f} kPa.")
    return told


def csv_header(names: Sequence[str]) -> str:
    """The first line of the table, without its line end."""
    columns = [f"{name}.{what}" for name in names for what in ("target", "strain", "pressure_kPa")]
    return ",".join(["time_s", *columns, "supply_kPa"])


def csv_rows(block: Block, until_s: float) -> Iterator[str]:
    """A line for each tick up to `until_s`; a pressure that the simulation does not know stays empty."""
    fibers = len(block.strain)
    for tick, time in enumerate(block.time_s):
        if time > until_s + 1e-9:
            return
        fields = [f"{time:.6f}"]
        for fiber in range(fibers):
            pressure = block.pressure_kPa[fiber, tick]
            fields += (
                f"{block.target[fiber, tick]:.7f}",
                f"{block.strain[fiber, tick]:.7f}",
                "" if np.isnan(pressure) else f"{pressure:.3f}",
            )
        fields.append(f"{block.supply_kPa[tick]:.3f}")
        yield ",".join(fields)


def _tidy(value: float) -> float:
    """Without the digits that are no more than rounding, and never -0."""
    return round(float(value), 9) + 0.0


def _share(share: float) -> str:
    return f"{100 * share:.0f} %" if share >= 0.01 else f"{100 * share:.1f} %"


def _bar_count(place: str) -> str:
    bar, _, count = place.partition(":")
    return f"{bar} count {count}"
