"""`play --retime`: a score mended before it is played, and what is left of it told where that cannot be."""

import numpy as np
from numpy.typing import NDArray

from composer.load import Loaded
from composer.tracks import Tracks

Array = NDArray[np.float64]


class NotMended(Exception):
    """Time alone does not mend the score; the text is the list of what is left, for the operator."""


def mended(loaded: Loaded) -> tuple[Tracks, Array, Array]:
    """The retimed tracks of a score, and its hits' instants as written and as retimed, (N,) s, from 0 on.

    Raises:
        NotMended: pins are too close, snags are left, or the solver gives up.
    """
    from composer.limits.check import check
    from composer.report.retime import is_good, sentences
    from composer.retime.programme import Unsolved
    from composer.retime.whole_score import retime_score

    try:
        retiming = retime_score(loaded)
    except Unsolved as failed:
        raise NotMended(f"{loaded.score.file}: the solver gave up: {failed}") from None
    checked = check(retiming.tracks, loaded.rig, loaded.abilities)
    if not is_good(retiming, checked):
        raise NotMended("\n".join(sentences(retiming, checked, loaded.rig, loaded.tempo)))
    return retiming.tracks, retiming.warp_was_s, retiming.warp_now_s
