"""What fibers can do, in lines of words: stroke, fastest fill and exhaust at rest and at full, air, channel."""

from collections.abc import Sequence

import numpy as np

from composer.limits.abilities import Abilities
from composer.limits.tables import travel_time_s
from composer.report.sentences import named
from composer.rig.model import Rig

MOST_KINDS = 4
"""Kinds of fiber that a group is explained by before the rest are only counted."""


def limits_of(fibers: Sequence[int], rig: Rig, abilities: Abilities) -> tuple[str, ...]:
    """Lines on what fibers (indices) can do, those that are alike together."""
    alike: dict[int, list[int]] = {}
    for fiber in fibers:
        alike.setdefault(int(abilities.which[fiber]), []).append(fiber)
    lines: list[str] = []
    for some in list(alike.values())[:MOST_KINDS]:
        if len(alike) > 1:
            lines.append(f"{named([rig.fibers[f].name for f in some])}:")
        lines += _able(some, rig, abilities)
    if len(alike) > MOST_KINDS:
        rest = sum(len(some) for some in list(alike.values())[MOST_KINDS:])
        lines.append(f"and {rest} more of {len(alike) - MOST_KINDS} other kinds")
    return tuple(lines)


def _able(some: list[int], rig: Rig, abilities: Abilities) -> list[str]:
    one = some[0]
    fiber, able = rig.fibers[one], abilities.capabilities[int(abilities.which[one])]
    stroke = float(abilities.stroke[one])
    way = f"{stroke * able.length_mm:.0f} mm" if able.turn_deg is None else f"{stroke * able.turn_deg:.0f}°"
    rates = [float(np.interp(at, able.strain, table)) for table in (able.fill, able.exhaust) for at in (0.0, stroke)]
    shares = [100.0 * rate / stroke for rate in rates]
    whole = [
        float(travel_time_s(abilities, np.array([one]), np.array([a]), np.array([b]))[0])
        for a, b in ((0.0, stroke), (stroke, 0.0))
    ]
    lines = [
        f"stroke {100.0 * stroke:.1f} % strain, {way} ({fiber.type.kind})",
        f"fills at {shares[0]:.0f} % of it a second at rest, {shares[1]:.0f} % at full; all of it in {whole[0]:.2f} s",
        f"empties at {shares[3]:.0f} % of it a second at full, {shares[2]:.0f} % at rest; all of it in {whole[1]:.2f} s",
        f"draws {1e3 * float(able.air_L[-1]):.1f} mL a full stroke",
    ]
    if np.isfinite(abilities.max_hold_s[one]):
        lines.append(f"may stay above half stroke for {float(abilities.max_hold_s[one]):g} s")
    if len(some) == 1:
        lines.append(f"channel {fiber.channel} of {fiber.driver}")
    else:
        by_driver: dict[str, list[int]] = {}
        for f in some:
            by_driver.setdefault(rig.fibers[f].driver, []).append(rig.fibers[f].channel)
        for driver, channels in by_driver.items():
            lines.append(f"channels {min(channels)} to {max(channels)} of {driver}" if len(channels) > 1 else
                         f"channel {channels[0]} of {driver}")  # fmt: skip
    return lines
