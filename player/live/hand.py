"""What the hands want of every fiber: events in, three layers out, the newest hand counts. No port, clock or score in here."""

from collections.abc import Callable, Collection
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from player.governor import ADDS, SCALES, TAKES, WAYS, mixed
from player.inputs.events import Begin, End, Silent, Wanted

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

MOST_PLAYING = 24
"""Phrases that sound at once; one more ends the one that has played longest."""

MOST_WAITING = 256
"""Phrases that wait for their moment."""

LAYERS = (TAKES, SCALES, ADDS)
"""In this order the layers are laid over a score: what takes its place, then what scales it, then what is added."""

NOBODY = -1
FADER = 0
"""Who holds a fiber in a layer: nobody, a control, or from 1 on the number of a phrase's playing."""

Shares = Callable[[float], tuple[Array, bool]]
"""A phrase as it is played: shares of stroke (F,) so many seconds after it began, and whether it is over."""


@dataclass(slots=True)
class Playing:
    """A phrase under way: `number` as in the layers, begun at `at_s`, `of` what it wants, `scale` the velocity."""

    number: int
    key: tuple[object, ...]
    at_s: float
    fibers: NDArray[np.int64]
    layer: int
    scale: float
    of: Shares
    bind: int


class Hand:
    """The hands of all sources together on F fibers.

    silent: (F,) fibers whose source has fallen silent: they come to rest, until a hand takes them or all hands let go
    """

    def __init__(self, stroke: Array, perform: Callable[[Begin], Shares]):
        """stroke: (F,) usable stroke; perform: makes a phrase ready to be played at the running tempo."""
        self._stroke, self._perform = stroke, perform
        count = len(stroke)
        self.silent = np.zeros(count, dtype=bool)
        self._falling = np.zeros(count, dtype=bool)
        self._value = np.full((len(WAYS), count), np.nan)
        self._holder = np.full((len(WAYS), count), NOBODY, dtype=np.int64)
        self._waiting: list[Begin] = []
        self._playing: list[Playing] = []
        self._number = 0

    @property
    def binds_playing(self) -> Collection[int]:
        """Binds whose phrase plays now: their keys are lit."""
        return {playing.bind for playing in self._playing if playing.bind >= 0}

    @property
    def to_rest(self) -> Mask:
        """(F,) fibers that are to come to rest at their safe rate, whatever else is wanted."""
        return self.silent | self._falling

    @property
    def touched(self) -> Mask:
        """(F,) fibers that some hand is on."""
        return np.any(self._holder != NOBODY, axis=0) | self.to_rest

    def take(self, event: Wanted | Begin | End | Silent) -> None:
        """An event; a phrase for later waits for its moment."""
        if isinstance(event, Wanted):
            self._hold(list(event.fibers), WAYS.index(event.how), FADER, event.stroke)
        elif isinstance(event, Begin):
            if len(self._waiting) < MOST_WAITING:
                self._waiting.append(event)
        elif isinstance(event, End):
            self._end(event)
        else:
            fibers = list(event.fibers)
            self._let_go(fibers)
            self.silent[fibers] = True

    def release(self) -> None:
        """All hands let go of everything: the score, or rest, has every fiber again."""
        self._value[:], self._holder[:] = np.nan, NOBODY
        self.silent[:] = self._falling[:] = False
        self._waiting.clear()
        self._playing.clear()

    def tick(self, now_s: float, strain: Array) -> None:
        """Let phrases begin whose moment has come, move those that play, and let go of those that are over.

        strain: (F,) where the fibers are; one that was let down has been given back once it is at rest
        """
        self._falling &= strain > 0.0
        due = [begin for begin in self._waiting if begin.at_s <= now_s]
        if due:
            self._waiting = [begin for begin in self._waiting if begin.at_s > now_s]
            for begin in sorted(due, key=lambda begin: begin.at_s):
                self._begin(begin, now_s)
        for playing in tuple(self._playing):
            mine = self._held(playing)
            share, over = playing.of(now_s - playing.at_s)
            if over or not mine.size:
                self._drop(playing, mine)
                continue
            self._value[playing.layer, mine] = share[mine] * playing.scale

    def over(self, score: Array) -> Array:
        """The strain (F,) wanted where a score wants `score` (F,); anything, the governor brings it within the stroke."""
        wanted, says = score, (~np.isnan(self._value)).any(axis=1)
        for layer in LAYERS:
            if says[layer]:
                wanted = mixed(wanted, self._value[layer], np.full(len(wanted), layer, dtype=np.int8), self._stroke)
        return wanted

    def _hold(self, fibers: list[int], layer: int, holder: int, value: float) -> None:
        self._value[layer, fibers], self._holder[layer, fibers] = value, holder
        self.silent[fibers] = self._falling[fibers] = False

    def _let_go(self, fibers: list[int]) -> None:
        self._value[:, fibers], self._holder[:, fibers] = np.nan, NOBODY

    def _begin(self, begin: Begin, now_s: float) -> None:
        if len(self._playing) >= MOST_PLAYING:
            self._drop(self._playing[0], self._held(self._playing[0]))
        self._number += 1
        layer, fibers = WAYS.index(begin.how), np.array(begin.fibers, dtype=np.int64)
        # It begins at its own moment, as far as that has passed within a tick or two.
        at_s = max(begin.at_s, now_s - 0.05)
        playing = Playing(
            self._number, begin.key, at_s, fibers, layer, begin.scale, self._perform(begin), begin.bind
        )  # fmt: skip
        self._playing.append(playing)
        self._hold(list(begin.fibers), layer, playing.number, np.nan)

    def _end(self, end: End) -> None:
        """A key is up: with `rest` its fibers come to rest, one that has not begun yet never does."""
        if not end.rest:
            return
        self._waiting = [begin for begin in self._waiting if begin.key != end.key]
        for playing in tuple(self._playing):
            if playing.key == end.key:
                mine = self._held(playing)
                self._drop(playing, mine)
                if playing.layer == TAKES:
                    self._falling[mine] = True

    def _held(self, playing: Playing) -> NDArray[np.int64]:
        """The fibers that a phrase still has: another hand may have taken some."""
        return playing.fibers[self._holder[playing.layer, playing.fibers] == playing.number]

    def _drop(self, playing: Playing, mine: NDArray[np.int64]) -> None:
        self._holder[playing.layer, mine], self._value[playing.layer, mine] = NOBODY, np.nan
        self._playing.remove(playing)
