"""One fiber's strand as it is shown: written, retimed and simulated over what the fiber can do."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QSize, Qt, Signal
from PySide6.QtGui import QImage, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from composer.picture.axes import say_seconds
from composer.picture.cloth.place import SAME_S
from composer.picture.cloth.sampling import Sampler, sampler_of
from composer.picture.cloth.view import BAR_PX
from composer.picture.cloth.weave import Weave
from composer.picture.look import Look, colour, focus_frame, painting
from composer.picture.palette import DARK, Theme
from composer.picture.strand import paint as strand_paint
from composer.picture.strand.curve import Knots, knots_of
from composer.picture.strand.paint import Face, Strand
from composer.picture.units import in_words, unit_of
from composer.tracks import Tracks

Array = NDArray[np.float64]

NARROWEST_S = 0.02
NOTHING = "Click a thread: its strand comes up here."


@dataclass(frozen=True, slots=True)
class Held:
    """A knot under the hand: `way` is "" until it is known, then "time" or "target"; one number is changed at a time."""

    knot: int
    segment: int
    was_s: float
    was_strain: float
    at_s: float
    strain: float
    way: str = ""
    free: bool = False

    @property
    def moved(self) -> bool:
        """Whether it is somewhere else than it was."""
        return self.at_s != self.was_s or self.strain != self.was_strain


class StrandShow(QWidget):
    """The strand of one fiber, as it is shown. Seconds and strains are those of the written tracks.

    stretch_changed(from_s, to_s): another stretch of time is shown
    """

    stretch_changed = Signal(float, float)

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent)
        self._theme = theme
        self._weave: Weave | None = None
        self._fiber: int | None = None
        self._written: Sampler | None = None
        self._retimed: Sampler | None = None
        self._knots: Knots | None = None
        self._simulated: tuple[Array, Array] | None = None
        self._snags: tuple[tuple[float, float, str], ...] = ()
        self._from_s, self._to_s = 0.0, 1.0
        self._reach_s = 0.0
        self._head_s = 0.0
        self._grid, self._targets = 0.25, 0.05
        self._percent = False
        self._chosen = -1
        self._held: Held | None = None
        self._still: QImage | None = None
        self._still_of: tuple[object, ...] = ()
        self._still_seen: tuple[object, ...] = ()
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMouseTracking(True)
        self.setMinimumSize(320, 120)
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self.setAccessibleName("strand")
        self.setAccessibleDescription(NOTHING)

    def sizeHint(self) -> QSize:
        """The size that it would like to have."""
        return QSize(960, 220)

    # What is shown.

    def set_strand(
        self,
        weave: Weave | None,
        fiber: int | None,
        retimed: Tracks | None = None,
        simulated: tuple[Array, Array] | None = None,
        snags: Sequence[tuple[float, float, str]] = (),
    ) -> None:
        """Show a fiber of a score, or nothing where either is None.

        retimed: tracks of the same rig; simulated: instants in s and strains, (T,) each; snags: from, to in s, and words
        (see `composer.picture.strand.curve.worded`). A held knot stays in the hand as long as the fiber has as many as before.
        """
        before, known = self._knots, self._weave
        if weave is None or fiber is None or not 0 <= fiber < weave.tracks.fibers:
            self._weave, self._fiber, self._knots, self._held = weave, None, None, None
            self._written = self._retimed = None
            self.setAccessibleName("strand")
            self.setAccessibleDescription(NOTHING)
            self.update()
            return
        self._written = sampler_of(weave.tracks, weave.abilities)
        other = fiber != self._fiber
        self._weave, self._fiber = weave, fiber
        self._knots = knots_of(weave.tracks, fiber)
        self._retimed = None if retimed is None else sampler_of(retimed, weave.abilities)
        self._simulated, self._snags = simulated, tuple(snags)
        if other or before is None or len(before.segment) != len(self._knots.segment):
            self._held, self._chosen = None, -1
        if known is None:
            self._from_s, self._to_s = 0.0, self._end_s
        self.setAccessibleName(f"strand of {weave.names[fiber]}")
        self.setAccessibleDescription(". ".join(words for _, _, words in self._snags))
        self.update()

    def set_theme(self, theme: Theme) -> None:
        """Show it in other colours."""
        self._theme = theme
        self.update()

    def set_grid(self, counts: float, targets: float = 0.05) -> None:
        """The grids that knots snap to: in counts, and in shares of stroke."""
        if not (counts > 0.0 and targets > 0.0):
            raise ValueError(f"grids of {counts} counts and {targets} of stroke; both must be more than 0")
        self._grid, self._targets = float(counts), float(targets)
        self.update()

    def set_percent(self, percent: bool) -> None:
        """Show strain in % of stroke in place of mm or degrees."""
        self._percent = percent
        self.update()

    @property
    def fiber(self) -> int | None:
        """The fiber shown."""
        return self._fiber

    @property
    def knots(self) -> Knots | None:
        """Its knots."""
        return self._knots

    @property
    def shown(self) -> tuple[float, float]:
        """The stretch of time shown, in s."""
        return self._from_s, self._to_s

    @property
    def holds(self) -> bool:
        """Whether a knot is held."""
        return self._held is not None

    @property
    def head_s(self) -> float:
        """Where the play head stands."""
        return self._head_s

    def set_head(self, at_s: float) -> None:
        """Put the play head at an instant, without `head_moved`."""
        self._head_s = at_s
        self.update()

    @property
    def _end_s(self) -> float:
        """The end of all that can be shown: the score's, or that of what would be instead, where it is later."""
        return max(self._weave.to_s, self._reach_s) if self._weave else 1.0

    def reach(self, end_s: float) -> None:
        """Something may be shown up to there, also beyond the score's end."""
        self._reach_s = end_s
        if self._weave is not None:
            self.show_stretch(*self.shown)

    def show_stretch(self, from_s: float, to_s: float) -> None:
        """Show a stretch of time, within the score."""
        whole = self._end_s if self._weave else max(to_s, 1e-3)
        length = min(max(to_s - from_s, min(NARROWEST_S, whole)), whole)
        begin = min(max(from_s, 0.0), whole - length)
        if abs(begin - self._from_s) > SAME_S or abs(begin + length - self._to_s) > SAME_S:
            self._from_s, self._to_s = begin, begin + length
            self.update()
            self.stretch_changed.emit(self._from_s, self._to_s)

    # A frame.

    def _face(self) -> Face | None:
        if self._weave is None or self._fiber is None or self._knots is None:
            return None
        scale = self.devicePixelRatioF()
        look = Look(scale * max(self.fontInfo().pixelSize(), 8) / 13.0, self._theme)
        size = (max(1, round((self.width() - BAR_PX) * scale)), max(1, round(self.height() * scale)))
        per_strain, unit = unit_of(self._weave.abilities, self._fiber)
        stroke = float(self._weave.abilities.stroke[self._fiber])
        if self._percent:
            per_strain, unit = 100.0 / stroke, "%"
        most = float(max(np.max(self._knots.strain, initial=0.0), stroke))
        least = float(min(np.min(self._knots.strain, initial=0.0), 0.0))
        return strand_paint.face(look, size, self._from_s, self._to_s, least, most, per_strain, unit)

    def _strand(self) -> Strand:
        assert self._weave is not None and self._fiber is not None and self._knots is not None and self._written is not None
        return Strand(
            self._weave.names[self._fiber], self._fiber, self._weave.abilities, self._weave.tempo, self._knots, self._written,
            self._retimed, self._simulated, self._snags,
        )  # fmt: skip

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw everything."""
        with painting(self) as painter:
            self._paint(painter)

    def _paint(self, painter: QPainter) -> None:
        painter.fillRect(self.rect(), colour(self._theme.ground))
        face = self._face()
        if face is None:
            strand_paint.nothing(painter, self.rect(), self._theme, NOTHING)
        else:
            painter.scale(1 / self.devicePixelRatioF(), 1 / self.devicePixelRatioF())
            held = self._held
            painter.drawImage(0, 0, self._standing(face))
            strand_paint.head(painter, face, self._head_s)
            if self.hasFocus():
                scale = self.devicePixelRatioF()
                focus_frame(painter, face.look, self.width() * scale, self.height() * scale)
            if held is not None:
                words = self._in_words(held)
                strand_paint.dragged(
                    painter, face, self._strand(), held.way, (held.was_s, held.was_strain), (held.at_s, held.strain),
                    words, self._grid, self._targets,
                )  # fmt: skip

    def _standing(self, face: Face) -> QImage:
        """All that stands still while the head moves, drawn again when any of it is another."""
        scale = self.devicePixelRatioF()
        size = QSize(max(1, round(self.width() * scale)), max(1, round(self.height() * scale)))
        of = (self._weave, self._knots, self._written, self._retimed, self._simulated, self._snags)
        seen = (face, self._fiber, self._chosen, size)
        if self._still is None or seen != self._still_seen or any(a is not b for a, b in zip(of, self._still_of, strict=True)):
            self._still_of, self._still_seen = of, seen
            self._still = QImage(size, QImage.Format.Format_RGB32)
            self._still.fill(colour(self._theme.ground))
            with painting(self._still) as painter:
                strand_paint.paint(painter, face, self._strand(), self._chosen)
        return self._still

    def _in_words(self, held: Held) -> str:
        assert self._weave is not None and self._fiber is not None
        place = f"{self._weave.tempo.say_place(held.at_s)}, {say_seconds(held.at_s, 2)}"
        target = in_words(self._weave.abilities, self._fiber, held.strain)
        off = ", off the grid" if held.free else ""
        return target + off if held.way == "target" else place + off if held.way == "time" else f"{place}: {target}"
