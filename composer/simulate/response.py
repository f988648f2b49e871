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
        delays, group = np.unique(delay_s, return_inverse=True)
        self._each: list[float] = delays.tolist() or [0.0]
        self._members = [np.flatnonzero(group == number) for number in range(len(self._each))]
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
        self._forget(begin)
        first, last = begin + SAME_INSTANT_S, end - SAME_INSTANT_S
        edges = {sent + delay for sent, _ in self._sent for delay in self._each}
        at = begin
        for until in sorted(edge for edge in edges if first < edge < last):
            if until - at > SAME_INSTANT_S:
                yield until - at, self._in_force(at)
                at = until
        yield end - at, self._in_force(at)

    def mean(self, dt_s: float, command: Array) -> Array:
        """Hold `command` (F,) for the next `dt_s`; the mean (F,) over that time of what is in force at each valve."""
        begin, end = self._now, self._now + dt_s
        self._sent.append((begin, np.array(command, dtype=float)))
        self._now = end
        self._forget(begin)
        mean = np.empty(len(self._at_rest))
        for members, delay in zip(self._members, self._each, strict=True):
            until, share = end - delay, np.zeros(len(members))
            for sent, held in reversed(self._sent):
                since = max(sent, begin - delay)
                if until > since:
                    share += held[members] * ((until - since) / dt_s)
                    until = since
                if sent <= begin - delay:
                    break
            mean[members] = share
        return mean

    def _forget(self, begin: float) -> None:
        """Drop what no valve will ever see again."""
        oldest = begin - self._each[-1]
        while len(self._sent) > 1 and self._sent[1][0] <= oldest + SAME_INSTANT_S:
            self._sent.popleft()

    def _in_force(self, at: float) -> Array:
        each = [self._latest(at - delay + SAME_INSTANT_S) for delay in self._each]
        if len(each) == 1:
            return each[0]
        command = np.empty(len(self._at_rest))
        for members, sent in zip(self._members, each, strict=True):
            command[members] = sent[members]
        return command

    def _latest(self, until: float) -> Array:
        """What was sent last, up to then."""
        return next(command for sent, command in reversed(self._sent) if sent <= until)
