"""What a cloth shows, as data that knows nothing of screens: the same for a file, the preview and the windows."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.picture.bands import Band
from composer.picture.bars import Bars

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Stretch:
    """A stretch of time on one fiber's thread, or on the supply's lane where `fiber` is None."""

    fiber: int | None
    from_s: float
    to_s: float


@dataclass(frozen=True, slots=True)
class CueMark:
    """A named place in time; at one that waits the player holds."""

    name: str
    at_s: float
    waits: bool


@dataclass(frozen=True, slots=True, eq=False)
class Lane:
    """A curve below the cloth: `values` (W,), one a column of the cloth, nan for none; from `low` to `high` in `unit`.

    colour: its name in the theme; limit: a level not to be passed, None for none, with the word for it
    supply: whether snags of the air lie over it
    """

    name: str
    unit: str
    values: Array
    low: float
    high: float
    colour: str
    limit: float | None = None
    limit_word: str = ""
    supply: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Scene:
    """A cloth from `from_s` to `to_s`: `share` (F, W) of stroke, a column a pixel, and all that lies round it.

    extending: (F,) which fibers lengthen; names: of the fibers, in the rig's order
    """

    title: str
    subtitle: str
    from_s: float
    to_s: float
    share: Array
    extending: NDArray[np.bool_]
    bands: tuple[Band, ...]
    names: tuple[str, ...]
    tempo: Bars
    snags: tuple[Stretch, ...] = ()
    pins_s: tuple[float, ...] = ()
    cues: tuple[CueMark, ...] = ()
    lanes: tuple[Lane, ...] = ()
