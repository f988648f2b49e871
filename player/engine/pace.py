"""How fast the score goes: 1 while it plays, 0 while it stands, eased between the two where fibers are in mid-move."""

import numpy as np

from composer.limits.abilities import Abilities
from composer.motion import rate_at
from composer.tracks import Tracks

EASE_S = 0.25
"""Seconds from full pace to a stand, and back; no time at all where nothing moves."""

PATIENCE_S = 1.0
"""Fibers at their acceleration limit may hold up a change of pace for so long; then it comes, at SLOWEST / EASE_S or faster."""

SLOWEST = 0.25

STILL = 1e-9
"""Strain rates below this, in 1/s, are no movement."""

JUST_BEFORE_S = 1e-6
"""A place is in mid-move if something moves just before it; what the score itself begins there may begin at once."""


class Pace:
    """The score's pace. All fibers share it, so that they stay together; slower than written is never past a rate limit."""

    def __init__(self, tracks: Tracks, abilities: Abilities):
        self.speed = 0.0
        self.wanted = 0.0
        self._tracks, self._abilities = tracks, abilities
        self._braced = np.isfinite(abilities.accel)
        self._eased_s = 0.0
        self._stop_s: float | None = None
        self._stop_moves = False

    def begin(self, at_s: float) -> None:
        """Play from a place: at full pace at once, but eased where that is in mid-move."""
        self.wanted = 1.0
        self.speed = 0.0 if self._moves(at_s) else 1.0

    def stand(self) -> None:
        """Stand now."""
        self.speed = self.wanted = 0.0

    def step(self, at_s: float, dt_s: float, stop_s: float | None) -> float:
        """Seconds of the score that pass in a tick from `at_s`; where something moves at `stop_s`, eased to stand there."""
        was = self.speed
        if was == self.wanted or not self._moves(at_s):
            now, self._eased_s = self.wanted, 0.0
        else:
            now = self._eased(at_s, dt_s)
            self._eased_s += dt_s
        if stop_s is not None and stop_s - at_s < EASE_S / 2.0 and self._moves_at_stop(stop_s):
            now = min(now, np.sqrt(2.0 * max(stop_s - at_s, 0.0) / EASE_S))
        self.speed = now
        # From a stand to full pace in no time: the whole tick is played; and the other way none of it.
        return dt_s * (now if abs(now - was) >= 1.0 else 0.5 * (was + now))

    def _eased(self, at_s: float, dt_s: float) -> float:
        usual = 1.0 / EASE_S if self.wanted > self.speed else -1.0 / EASE_S
        change = self._within_acceleration(at_s, usual)
        low, high = sorted((self.speed, self.wanted))
        return min(max(self.speed + change * dt_s, low), high)

    def _within_acceleration(self, at_s: float, usual: float) -> float:
        """The change of pace, 1/s, nearest to `usual` at which pace² f'' + change f' is within every fiber's acceleration."""
        if not self._braced.any():
            return usual
        rate, later = rate_at(self._tracks, self._abilities, [at_s, at_s + JUST_BEFORE_S]).T
        held = self._braced & (np.abs(rate) > STILL)
        if not held.any():
            return usual
        rate, later, most = rate[held], later[held], self._abilities.accel[held]
        bent = self.speed**2 * (later - rate) / JUST_BEFORE_S
        bounds = np.sort(np.stack([(-most - bent) / rate, (most - bent) / rate]), axis=0)
        change = min(max(usual, float(bounds[0].max())), float(bounds[1].min()))
        least = SLOWEST * usual if self._eased_s >= PATIENCE_S else 0.0
        return max(change, least) if usual > 0.0 else min(change, least)

    def _moves(self, at_s: float) -> bool:
        if at_s <= JUST_BEFORE_S:
            return False
        return bool(np.any(np.abs(rate_at(self._tracks, self._abilities, [at_s - JUST_BEFORE_S])) > STILL))

    def _moves_at_stop(self, stop_s: float) -> bool:
        if stop_s != self._stop_s:
            self._stop_s, self._stop_moves = stop_s, self._moves(stop_s)
        return self._stop_moves
