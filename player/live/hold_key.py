"""A key that is held, as a terminal tells of it: it only ever says that the key is down, again and again.

So that it is up shows only in that nothing more comes. How long it takes to be sure of that depends on how fast the keyboard
repeats, which is learned while the key is held.
"""

from collections import deque

FIRST_S = 0.9
"""The first repeat comes within so long of the press."""

AGAIN_S = 0.3
"""The others come within so long of one another, on any keyboard."""

LEAST_S = 0.1
"""Within this even the fastest keyboard may be late, over a network for one."""

KNOWN, PATIENCE = 3, 2.5
"""So many repeats tell how far apart they are; so many times the longest of the last of them is waited."""


class HoldKey:
    """Presses in, up and down out. down: whether it is held; until_s: when it is taken to be up if nothing more comes."""

    def __init__(self) -> None:
        self.down = False
        self.until_s = float("-inf")
        self._last_s = float("-inf")
        self._between: deque[float] = deque(maxlen=6)
        self._repeats = 0

    def pressed(self, now_s: float) -> bool:
        """The key has come in; whether it has just gone down."""
        went, self.down = not self.down, True
        if went:
            self._between.clear()
            self._repeats = 0
            self.until_s = now_s + FIRST_S
        else:
            self._repeats += 1
            if self._repeats > 1:  # before the first repeat a keyboard waits longer
                self._between.append(now_s - self._last_s)
            self.until_s = max(now_s + self._within_s(), self.until_s if self._repeats < KNOWN else 0.0)
        self._last_s = now_s
        return went

    def is_up(self, now_s: float) -> bool:
        """Whether it has just come up."""
        if not self.down or now_s <= self.until_s:
            return False
        self.down = False
        return True

    def _within_s(self) -> float:
        if len(self._between) < KNOWN:
            return AGAIN_S
        return min(AGAIN_S, max(LEAST_S, PATIENCE * max(self._between)))
