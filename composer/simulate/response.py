"""The valves' response: what is sent takes effect after a valve's switching time, to the instant, whatever the tick."""

from collections import deque
from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from composer.tracks import SAME_INSTANT_S

Array = NDArray[np.float64]


class Response:
    """A delay of its own for each fiber: commands held from tick to tick go in, stretches of constant command come out."""

    def __init__(self, delay_s: Array, at_rest: Array):
        """`delay_s` (F,) seconds, `at_rest` (F,) the command that has always been in force before the first."""
        self._at_rest = at_rest
        self._delays, group = np.unique(delay_s, return_inverse=True)
        self._members = [np.flatnonzero(group == number) for number in range(len(self._delays))]
        self.reset()

    def reset(self) -> None:
        """Forget all commands."""
        self._now = 0.0
        self._sent: deque[tuple[float, Array]] = deque([(-np.inf, self._at_rest.copy())])

    def hold(self, dt_s: float, command: Array) -> Iterator[tuple[float, Array]]:
        """Hold `command` (F,) for the next `dt_s`; yields (seconds, command in force (F,)), stretches that make up the tick."""
        begin, end = self._now, self._now + dt_s
        self._sent.append((begin, np.array(command, dtype=float)))
        self._now = end
        oldest = begin - self._delays[-1]
        while len(self._sent) > 1 and self._sent[1][0] <= oldest + SAME_INSTANT_S:
            self._sent.popleft()
        turns = np.array([sent for sent, _ in self._sent])
        edges = (turns[:, None] + self._delays).ravel()
        inside = np.unique(edges[(edges > begin + SAME_INSTANT_S) & (edges < end - SAME_INSTANT_S)])
        at = begin
        for until in [*inside, end]:
            if until - at > SAME_INSTANT_S or until == end:
                yield until - at, self._in_force(turns, at)
                at = until

    def _in_force(self, turns: Array, at: float) -> Array:
        which = np.searchsorted(turns, at - self._delays + SAME_INSTANT_S, side="right") - 1
        if len(self._delays) == 1:
            return self._sent[int(which[0])][1]
        command = np.empty(len(self._at_rest))
        for members, turn in zip(self._members, which, strict=True):
            command[members] = self._sent[int(turn)][1][members]
        return command
