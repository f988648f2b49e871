"""A hand on a running score: what is wanted of each fiber when both have something to say."""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

WAYS = ("alone", "takes", "adds", "scales")
"""By number: no hand on the fiber, the hand in the score's place, added to it, the score times the hand."""

ALONE, TAKES, ADDS, SCALES = range(4)


def mixed(score: Array, hand: Array, way: NDArray[np.int8], stroke: Array) -> Array:
    """The strain (F,) wanted where a score wants `score` and a hand says `hand`, each fiber by its `way`.

    score: (F,) strain; hand: (F,) the value of the bind, as a share of stroke, or for `scales` as a factor; stroke: (F,)
    way: (F,) index into `WAYS`. A hand that is no number (nan: nothing has come in yet) leaves the score alone.

    The result may lie anywhere: it is the governor that brings it within the stroke, and says so.
    """
    share = hand * stroke
    found = np.where(way == TAKES, share, np.where(way == ADDS, score + share, np.where(way == SCALES, score * hand, score)))
    return np.where(np.isnan(hand), score, found)
