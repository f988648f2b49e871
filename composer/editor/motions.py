"""Whether two texts ask for the same motion."""

import numpy as np

from composer.quivers import Quivers
from composer.tracks import Tracks


def same_motion(one: Tracks, other: Tracks) -> bool:
    """Whether both ask every fiber for the same at the same times, wherever in a text that is written."""
    if one is other:
        return True
    arrays = ("first", "time_s", "curve", "manner", "shape")
    return (
        one.duration_s == other.duration_s
        and all(np.array_equal(getattr(one, name), getattr(other, name)) for name in arrays)
        and all(np.array_equal(getattr(one.quivers, name), getattr(other.quivers, name)) for name in Quivers.__slots__)
    )
