"""Themes dimmed for a dark room: less light, and everything that is read as readable as before."""

from dataclasses import fields, replace

import numpy as np
from numpy.typing import NDArray

from composer.picture.palette import MARKS_ON, TEXT_ON, Colour, Theme, contrast

DIMS = (1.0, 0.5, 0.22)
"""How much light is left, step by step."""

SAID = {1.0: "full light", 0.5: "half light", 0.22: "least light"}

TEXT, MARK = 4.5, 3.0
"""Contrast of what is read and of what is seen (WCAG 2.2, 1.4.3 and 1.4.11)."""

ROOM = 1.04
"""Above these, as colours are whole numbers."""

_BACKS = ("ground", "panel", "raised", "field")


def dimmed(theme: Theme, share: float) -> Theme:
    """A dark theme with that share of its light; grounds go down with it, letters only as far as they can be read."""
    if share >= 1.0:
        return theme
    # In sRGB numbers, light goes with about the power 2.2.
    factor = share ** (1.0 / 2.2)
    changed = {}
    for field in fields(theme):
        value = getattr(theme, field.name)
        if isinstance(value, tuple):
            changed[field.name] = _scaled(value, factor * (0.75 if field.name in _BACKS else 1.0))
        elif isinstance(value, np.ndarray):
            changed[field.name] = np.rint(value * factor).astype(np.uint8)
    found = replace(theme, name=f"{theme.name}, {SAID.get(share, f'{share:.0%}')}", **changed)
    for table, least in ((TEXT_ON, TEXT), (MARKS_ON, MARK)):
        for name, behind in table:
            backs = [getattr(found, one) for one in behind if getattr(found, one) != getattr(found, name)]
            found = replace(found, **{name: readable(getattr(found, name), backs, least * ROOM, getattr(theme, name))})
    return found


def readable(colour: Colour, backs: list[Colour], least: float, full: Colour) -> Colour:
    """A colour brought as far towards `full`, the one of the undimmed theme, as it takes to stand out from all `backs`."""
    for step in np.linspace(0.0, 1.0, 65):
        tried = _towards(colour, full, float(step))
        if all(contrast(tried, back) >= least for back in backs):
            return tried
    return full


def _scaled(colour: Colour, factor: float) -> Colour:
    red, green, blue = (round(channel * factor) for channel in colour)
    return red, green, blue


def _towards(colour: Colour, other: Colour, share: float) -> Colour:
    mixed: NDArray[np.int64] = np.rint(np.array(colour) * (1.0 - share) + np.array(other) * share).astype(int)
    red, green, blue = mixed.tolist()
    return red, green, blue
