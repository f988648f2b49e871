"""What outputs have counted, and shares and times too small for their decimals, in words."""

from collections.abc import Mapping
from typing import Any

from composer.files import say_bytes

LOST = {
    "skipped": "set not sent",
    "dropped_at_board": "set dropped by the board's full queue",
    "late_at_board": "set late at the board",
    "bad_at_board": "frame damaged on the way there",
    "unreadable": "frame damaged on the way back",
    "echoes": "frame echoed",
}
"""Counters that are 0 in a good run: what one of each is."""


def small(value: float, decimals: int = 2) -> str:
    """A number with its decimals; one that would read 0 and is not is "less than" the least of them."""
    least = 10.0**-decimals
    return f"less than {least:.{decimals}f}" if 0.0 < abs(value) < 0.5 * least else f"{value:.{decimals}f}"


def sentence(output: Mapping[str, Any]) -> str:
    """An output of a run's report as a person reads it: where to, and what it has counted."""
    parts = [f"{output['sets']:g} {'set' if output['sets'] == 1 else 'sets'}"]
    if "bytes" in output:
        parts.append(say_bytes(int(output["bytes"])))
    if "lowest_supply_kPa" in output:
        parts.append(f"the supply never below {output['lowest_supply_kPa']:.0f} kPa")
    if "strain_left" in output:
        left = output["strain_left"]
        parts.append("all at rest in the end" if left < 5e-5 else f"a strain of up to {100.0 * left:.2f} % left in the end")
    lost = [f"{output[key]:g} {_several(one, output[key])}" for key, one in LOST.items() if output.get(key)]
    if any(key in output for key in LOST):
        parts.append(", ".join(lost) if lost else "none lost, late or damaged")
    if "clock_bound_us" in output:
        parts.append(f"clock known to {output['clock_bound_us'] / 1e3:.1f} ms")
    if "round_trip_us" in output:
        parts.append(f"answers within {output['round_trip_us'] / 1e3:.1f} ms")
    return f"{output['target']} ({'+'.join(output['drivers'])}): {', '.join(parts)}."


def _several(one: str, count: float) -> str:
    noun, _, rest = one.partition(" ")
    return one if count == 1 else f"{noun}s {rest}"
