"""A strain as people measure it: in mm along or ° of turn, and as a share of what the fiber can do."""

import numpy as np

from composer.limits.abilities import Abilities


def unit_of(abilities: Abilities, fiber: int) -> tuple[float, str]:
    """What a strain of 1 is on this fiber, and its unit: mm along, or ° of turn where it bends or coils."""
    turn = float(abilities.turn_deg[fiber])
    return (float(abilities.length_mm[fiber]), "mm") if np.isnan(turn) else (turn, "°")


def in_words(abilities: Abilities, fiber: int, strain: float) -> str:
    """A strain in real units and as a share of stroke: "48.0 mm, 60 % of stroke"."""
    per_strain, unit = unit_of(abilities, fiber)
    stroke = float(abilities.stroke[fiber])
    gap = "" if unit == "°" else " "
    return f"{strain * per_strain:.1f}{gap}{unit}, {100.0 * strain / stroke:.0f} % of stroke"
