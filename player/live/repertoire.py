"""The phrases of a score, ready to be played by hand on any of its fibers, at any tempo."""

from collections import OrderedDict
from dataclasses import replace
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from composer.limits.abilities import Abilities
from composer.motion import Cursor
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.expand import expand
from composer.score.model import Entry, Name, Place, Score, Section, Span, Tempo
from composer.score.tempo import tempo_map
from composer.tracks import Tracks
from player.live.hand import Shares

Array = NDArray[np.float64]

MOST_KEPT = 128
"""Phrases kept ready, each for its fibers and tempo."""

STEP = 2
"""Tempi are told apart to one part in this many of a count a minute: a followed clock is never quite the same."""


class Repertoire:
    """Phrases by name. What has been played once at a tempo is kept ready for it."""

    def __init__(self, score: Score, rig: Rig, abilities: Abilities):
        self._score, self._rig, self._abilities = score, rig, abilities
        self._selector = Selector(rig, {})
        self._kept: OrderedDict[tuple[str, tuple[int, ...], Fraction], Tracks] = OrderedDict()

    def ready(self, phrase: str, fibers: tuple[int, ...], rate: float) -> None:
        """Make a phrase ready at `rate` counts a second. Raises Faults where these fibers cannot play it."""
        self._tracks(phrase, fibers, rate)

    def perform(self, phrase: str, fibers: tuple[int, ...], rate: float) -> Shares:
        """The phrase from its beginning at `rate` counts a second, as shares of stroke (F,) by seconds since then."""
        tracks = self._tracks(phrase, fibers, rate)
        cursor, stroke = Cursor(tracks, self._abilities), self._abilities.stroke

        def shares(gone_s: float) -> tuple[Array, bool]:
            return cursor.at(gone_s)[0] / stroke, gone_s > tracks.duration_s

        return shares

    def _tracks(self, phrase: str, fibers: tuple[int, ...], rate: float) -> Tracks:
        a_minute = Fraction(min(1000 * STEP, max(STEP, round(60.0 * rate * STEP))), STEP)
        key = (phrase, fibers, a_minute)
        found = self._kept.pop(key, None)
        if found is None:
            found = self._expanded(phrase, fibers, a_minute)
            while len(self._kept) >= MOST_KEPT:
                self._kept.popitem(last=False)
        self._kept[key] = found
        return found

    def _expanded(self, phrase: str, fibers: tuple[int, ...], a_minute: Fraction) -> Tracks:
        """A score of this phrase alone, begun at once."""
        span = self._score.phrases[phrase].span
        names = tuple(Name(self._rig.fibers[fiber].name, span) for fiber in fibers)
        begin = Place(1, Fraction(1), None, span)
        alone = replace(
            self._score, meters=(), tempi=(Tempo(a_minute, None, None, None, span),), groups={}, pins=(), cues=(),
            sections=(Section("hand", begin, None, "", Fraction(1), (_entry(names, Name(phrase, span), span),), span),),
        )  # fmt: skip
        return expand(alone, self._rig, self._abilities, self._selector, tempo_map(alone))


def _entry(names: tuple[Name, ...], phrase: Name, span: Span) -> Entry:
    return Entry(
        fibers=names, phrase=phrase, at=None, after=None, repeat=None, canon=None, ripple=None, scale=Fraction(1),
        stretch=Fraction(1), retrograde=False, mirror=False, scatter=None, add=False, firm=Fraction(1), span=span,
    )  # fmt: skip
