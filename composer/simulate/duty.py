"""Coil duty as it runs: how much of its allowance each valve has used up, a token bucket seen from its empty side."""

import numpy as np
from numpy.typing import NDArray

from composer.limits.coil import Coils

Array = NDArray[np.float64]

STILL = 1e-9
"""Strain by which a fiber must move in a step for its coil to count as energised."""


def beyond_after(coils: Coils, beyond_s: Array, was: Array, strain: Array, dt_s: float) -> Array:
    """On-time beyond the duty, in s (F,), after a step from strain `was` to `strain`: at most `burst_s` is allowed.

    It is the greatest excess of on-time over duty in any span that ends now (Cruz 1991, the backlog of a leaky bucket).
    """
    on = (np.abs(strain - was) > STILL) | (coils.holding & (strain > STILL))
    return np.maximum(beyond_s + (on - coils.duty) * dt_s, 0.0)


def share_used(coils: Coils, beyond_s: Array) -> Array:
    """Share of each coil's allowance in use, (F,): 1 is all of it; a coil that has none is at 1 as soon as it is beyond."""
    return np.divide(beyond_s, coils.burst_s, out=(beyond_s > STILL).astype(float), where=coils.burst_s > 0.0)
