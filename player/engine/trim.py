"""Correction of set-points from sensed strain: learned level by level, bounded, frozen where something is wrong.

A fiber whose model is off stands elsewhere than asked, by much the same the next time it is asked for as much. So what must be
asked for to have it stand where it is wanted is learned as a curve over its stroke, and used from the next tick on, standing or
moving. Each time that a fiber has come to rest it shows one point of the curve; the rest of it follows by as much as
is known of such curves: they rise in proportion, a little bent, with humps of their own (a Gaussian process: Rasmussen and
Williams, Gaussian Processes for Machine Learning, 2006), kept at a few levels and brought up to date point by point
(Kalman 1960), so that the first point moves much and the hundredth little.

Corrections are shares of stroke, and become set-points by the model's own curve: near full stroke a contractile fiber takes
many times the pressure for one percent more than it takes near rest.
"""

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LEVELS = np.linspace(0.0, 1.0, 9)
"""Shares of stroke at which corrections are kept; between them the straight line holds."""

MOST = 0.2
"""Share of stroke by which a fiber is asked for more or less at most."""

A_SECOND = 0.5
"""Share of stroke by which a correction changes in a second at most: a fiber glides to its place."""

SLACK_S = 0.1
"""A fiber is wanted to stand where, so long before and after, it is wanted within STILL of one place."""

SETTLED_S = 0.08
"""How long a fiber must have been at rest, sensed and wanted, its correction too, before it shows anything."""

STILL = 0.02
"""Share of stroke within which a fiber is wanted to stand; sensed it must keep within the fifth part."""

OPEN = 0.02
"""Set-points and strains below this are on their way to rest, and left alone."""

LONGEST_S = 0.2
"""The time between two senses counts up to this: after a gap nothing is made up for."""

PROPORTION, BENT, OFFSET, HUMP, HUMP_OVER = 0.15, 0.15, 0.02, 0.03, 0.15
"""How far off models are, as standard deviations in shares of stroke: at full stroke in proportion and by the square; all
along; and locally, over so much of the stroke."""

NOISE, A_POINT = 0.008, 0.003
"""Standard deviations of what one point shows (friction, sensor), and of how much a curve changes until the next."""

EARLIER = 0.2
"""How far off what an earlier run learned may be, as a share of how far off models are."""

ANSWERS = 0.15
"""A fiber that does by less than this share of it what its correction asked of it is stuck, and is asked no more."""

_HUMPS = np.exp(-0.5 * ((LEVELS[:, None] - LEVELS) / HUMP_OVER) ** 2)
_LIKELY = PROPORTION**2 * np.outer(LEVELS, LEVELS) + BENT**2 * np.outer(LEVELS**2, LEVELS**2) + OFFSET**2 + HUMP**2 * _HUMPS


class Trim:
    """What F fibers are asked for more or less than is wanted.

    by: (F, levels) learned at each of LEVELS, shares of stroke; now: (F, levels) as applied, which follows
    """

    def __init__(self, standing: Array, may: NDArray[np.bool_]):
        """standing: (F, n) set-points at which the model has each fiber stand at n even shares of stroke, 0 to 1; may: (F,)
        which are corrected, those whose driver takes a set-point."""
        fibers = len(standing)
        self.by, self.now = np.zeros((2, fibers, len(LEVELS)))
        self._standing, self._may, self._row = standing, may, np.arange(fibers)
        self._spread = np.repeat(_LIKELY[None], fibers, axis=0)
        self._at_s, self._moved_s = np.full((2, fibers), -np.inf)
        # Where each stands, and what it showed last in this stand: strain, and its correction then.
        self._rests, self._shown, self._asked = np.full((3, fibers), np.nan)

    def begin_with(self, by: Array) -> None:
        """Take up what an earlier run learned, (F, levels), as `by` was at its end; still open to what this run shows."""
        self.by[:] = self.now[:] = np.clip(by, -MOST, MOST)
        self._spread[:] = _LIKELY * EARLIER**2

    def sense(self, at_s: float, fibers: Index, share: Array, low: Array, high: Array, frozen: NDArray[np.bool_]) -> None:
        """What was sensed of fibers (S,), shares of stroke, and the zone in which it was wanted; frozen: (F,)."""
        since = np.clip(at_s - self._at_s[fibers], 0.0, LONGEST_S)
        self._at_s[fibers] = at_s
        wanted = 0.5 * (low + high)
        stands = self._may[fibers] & ~frozen[fibers] & (high - low < STILL) & (low > OPEN)
        step = np.where(frozen[fibers, None], 0.0, self.by[fibers] - self.now[fibers])
        self.now[fibers] += np.clip(step, -A_SECOND * since[:, None], A_SECOND * since[:, None])

        glides = np.abs(_between(step, np.arange(len(fibers)), wanted)) > 0.1 * NOISE
        leaves = ~(np.abs(share - self._rests[fibers]) < 0.2 * STILL)
        self._rests[fibers[leaves]] = share[leaves]
        self._moved_s[fibers[~stands | leaves | glides]] = at_s
        self._shown[fibers[~stands]] = np.nan
        rested = np.flatnonzero(stands & (at_s - self._moved_s[fibers] >= SETTLED_S))
        if rested.size:
            self._learn(at_s, fibers[rested], share[rested], wanted[rested])

    def _learn(self, at_s: float, fibers: Index, share: Array, wanted: Array) -> None:
        """One point of the curves of fibers that have come to rest."""
        self._moved_s[fibers] = at_s
        missing, by = wanted - share, _between(self.now, fibers, wanted)
        # No more is asked of what cannot give it: at an end of its set-point, or stuck.
        sent = self._sent(fibers, wanted + by)
        end = ((sent >= 1.0) & (missing > 0.0)) | ((sent <= OPEN) & (missing < 0.0))
        asked, did = by - self._asked[fibers], share - self._shown[fibers]
        stuck = (np.abs(asked) > NOISE) & (did * asked < ANSWERS * asked**2)  # false where there was no point before
        go = ~end & ~stuck
        fibers, share, wanted, missing, by = (values[go] for values in (fibers, share, wanted, missing, by))
        self._shown[fibers], self._asked[fibers] = share, by

        below, over = _place(wanted)
        shows = np.zeros((len(fibers), len(LEVELS)))
        row = np.arange(len(fibers))
        shows[row, below], shows[row, below + 1] = 1.0 - over, over
        spread = self._spread[fibers] + A_POINT**2 * _HUMPS
        along = np.einsum("fij,fj->fi", spread, shows)
        gain = along / (np.einsum("fi,fi->f", shows, along) + NOISE**2)[:, None]
        news = by + missing - _between(self.by, fibers, wanted)
        self.by[fibers] = np.clip(self.by[fibers] + gain * news[:, None], -MOST, MOST)
        self._spread[fibers] = spread - gain[:, :, None] * along[:, None, :]

    def applied(self, command: Array, share: Array) -> Array:
        """The set-points (F,) to be sent, for strains wanted, shares of stroke (F,)."""
        by = _between(self.now, self._row, share)
        more = self._sent(self._row, share + by) - self._sent(self._row, share)
        return np.where(self._may & (command > OPEN), np.clip(command + more, 0.0, 1.0), command)

    def _sent(self, fibers: Index, share: Array) -> Array:
        """Set-points by the model's curve, going on straight beyond full stroke."""
        points = self._standing.shape[1] - 1
        below = np.clip((share * points).astype(np.int64), 0, points - 1)
        low = self._standing[fibers, below]
        return low + (share * points - below) * (self._standing[fibers, below + 1] - low)


def _place(share: Array) -> tuple[Index, Array]:
    """The level below each share of stroke, and how far it is on the way to the next."""
    place = np.clip(share, 0.0, 1.0) * (len(LEVELS) - 1)
    below = np.minimum(place.astype(np.int64), len(LEVELS) - 2)
    return below, place - below


def _between(values: Array, rows: Index, share: Array) -> Array:
    """Values (rows, levels) at shares of stroke, one for each of `rows`."""
    below, over = _place(share)
    return values[rows, below] * (1.0 - over) + values[rows, below + 1] * over
