"""One fiber's strand under hands: written, retimed and simulated over what the fiber can do, with knots that can be dragged."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from PySide6.QtCore import QPointF, QSize, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QWheelEvent
from PySide6.QtWidgets import QWidget

from composer.picture import strand_paint
from composer.picture.axes import say_seconds
from composer.picture.look import Look, colour, painting
from composer.picture.palette import DARK, Theme
from composer.picture.sampling import Sampler
from composer.picture.strand import Knots, in_words, knots_of, unit_of
from composer.picture.strand_paint import Face, Strand
from composer.picture.view import BAR_PX
from composer.picture.weave import Weave
from composer.tracks import Tracks

Array = NDArray[np.float64]

NEAR_PX = 9
FREE_STEP_S = 0.005
FREE_STEP_SHARE = 0.001
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


class StrandView(QWidget):
    """The strand of one fiber. Seconds and strains are those of the written tracks.

    time_dragged(segment, seconds, free): a knot is being moved in time; on the grid unless `free`
    target_dragged(segment, strain, free): a knot's target is being moved; on the grid of targets unless `free`
    knot_dropped(kept): it was let go; where not `kept`, the drag signal has just put it back
    knot_clicked(segment, seconds): a knot was clicked, without being moved
    head_moved(seconds), stretch_changed(from_s, to_s): as of a cloth
    """

    time_dragged = Signal(int, float, bool)
    target_dragged = Signal(int, float, bool)
    knot_dropped = Signal(bool)
    knot_clicked = Signal(int, float)
    head_moved = Signal(float)
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
        self._head_s = 0.0
        self._grid, self._targets = 0.25, 0.05
        self._percent = False
        self._chosen = -1
        self._touring = True
        self._held: Held | None = None
        self._press: tuple[str, QPointF, QPointF] | None = None
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
        (see `composer.picture.strand.worded`). A held knot stays in the hand as long as the fiber has as many as before.
        """
        before, known = self._knots, self._weave
        if weave is None or fiber is None or not 0 <= fiber < weave.tracks.fibers:
            self._weave, self._fiber, self._knots, self._held = weave, None, None, None
            self._written = self._retimed = None
            self.setAccessibleName("strand")
            self.setAccessibleDescription(NOTHING)
            self.update()
            return
        if known is None or weave.tracks is not known.tracks or self._written is None:
            self._written = Sampler(weave.tracks, weave.abilities)
        other = fiber != self._fiber
        self._weave, self._fiber = weave, fiber
        self._knots = knots_of(weave.tracks, fiber)
        self._retimed = None if retimed is None else Sampler(retimed, weave.abilities)
        self._simulated, self._snags = simulated, tuple(snags)
        if other or before is None or len(before.segment) != len(self._knots.segment):
            self._held, self._chosen = None, -1
        if known is None:
            self._from_s, self._to_s = 0.0, weave.to_s
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

    def show_stretch(self, from_s: float, to_s: float) -> None:
        """Show a stretch of time, within the score."""
        whole = self._weave.to_s if self._weave else max(to_s, 1e-3)
        length = min(max(to_s - from_s, min(NARROWEST_S, whole)), whole)
        begin = min(max(from_s, 0.0), whole - length)
        if (begin, begin + length) != (self._from_s, self._to_s):
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
            strand_paint.paint(painter, face, self._strand(), self._head_s, self._chosen)
            if held is not None:
                words = self._in_words(held)
                strand_paint.dragged(
                    painter, face, self._strand(), held.way, (held.was_s, held.was_strain), (held.at_s, held.strain),
                    words, self._grid, self._targets,
                )  # fmt: skip

    def _in_words(self, held: Held) -> str:
        assert self._weave is not None and self._fiber is not None
        place = f"{self._weave.tempo.say_place(held.at_s)}, {say_seconds(held.at_s, 2)}"
        target = in_words(self._weave.abilities, self._fiber, held.strain)
        off = ", off the grid" if held.free else ""
        return target + off if held.way == "target" else place + off if held.way == "time" else f"{place}: {target}"

    # A knot under the hand.

    def _grab(self, knot: int) -> None:
        assert self._knots is not None
        at, strain = float(self._knots.at_s[knot]), float(self._knots.strain[knot])
        self._held = Held(knot, int(self._knots.segment[knot]), at, strain, at, strain)
        self._chosen = knot
        self.setAccessibleDescription(f"holding the knot at {self._in_words(self._held)}")
        self.update()

    def _carry_time(self, at_s: float, free: bool) -> None:
        held = self._held
        assert held is not None and self._weave is not None
        tempo = self._weave.tempo
        line = round(float(tempo.counts(at_s)) / self._grid)
        now = max(at_s, 0.0) if free else float(tempo.seconds(max(line, 0) * self._grid))
        self._held = replace(held, way="time", at_s=now, free=free)
        if now != held.at_s:
            self.time_dragged.emit(held.segment, now, free)
        self._carried()

    def _carry_target(self, strain: float, free: bool) -> None:
        held = self._held
        assert held is not None and self._weave is not None and self._fiber is not None
        stroke = float(self._weave.abilities.stroke[self._fiber])
        share = min(max(strain / stroke, 0.0), 1.0)
        now = (share if free else round(share / self._targets) * self._targets) * stroke
        self._held = replace(held, way="target", strain=now, free=free)
        if now != held.strain:
            self.target_dragged.emit(held.segment, now, free)
        self._carried()

    def _carried(self) -> None:
        assert self._held is not None
        self.setAccessibleDescription(self._in_words(self._held))
        self.update()

    def _let_go(self, kept: bool) -> None:
        held, self._held = self._held, None
        if held is None:
            return
        if not kept and held.at_s != held.was_s:
            self.time_dragged.emit(held.segment, held.was_s, True)
        if not kept and held.strain != held.was_strain:
            self.target_dragged.emit(held.segment, held.was_strain, True)
        self.knot_dropped.emit(kept and held.moved)
        self.update()

    # Mouse.

    def _at(self, place: QPointF) -> QPointF:
        return place * self.devicePixelRatioF()

    def _knot_near(self, face: Face, at: QPointF) -> int:
        assert self._knots is not None
        if not len(self._knots.segment):
            return -1
        apart = np.hypot(face.x_of(self._knots.at_s) - at.x(), face.y_of(self._knots.strain) - at.y())
        nearest = int(np.argmin(apart))
        return nearest if apart[nearest] <= face.look.px(NEAR_PX) else -1

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Take hold of a knot, or of the play head."""
        face, at = self._face(), self._at(event.position())
        if face is None or event.button() != Qt.MouseButton.LeftButton or self._held is not None:
            return
        knot = self._knot_near(face, at)
        if knot >= 0:
            self._press = ("knot", at, at)
            self._grab(knot)
        elif at.y() > face.box.bottom() or at.y() < face.box.top():
            self._press = ("head", at, at)
            self._put_head(face.s_of(at.x()))
        else:
            self._press = ("strand", at, at)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Carry the knot: whichever way it sets out, that number alone is changed."""
        face, at = self._face(), self._at(event.position())
        if face is None:
            return
        if self._press is None:
            self.setCursor(Qt.CursorShape.SizeAllCursor if self._knot_near(face, at) >= 0 else Qt.CursorShape.ArrowCursor)
            return
        what, start, last = self._press
        free = bool(event.modifiers() & Qt.KeyboardModifier.AltModifier)
        by = at - start
        if what == "head":
            self._put_head(face.s_of(at.x()))
        elif what == "knot" and self._held is not None:
            way = self._held.way
            if not way and max(abs(by.x()), abs(by.y())) >= face.look.px(4):
                way = "time" if abs(by.x()) >= abs(by.y()) else "target"
            if way == "time":
                self._carry_time(self._held.was_s + by.x() * face.per_px, free)
            elif way == "target":
                self._carry_target(self._held.was_strain - by.y() * face.strain_px, free)
        elif what == "pan" or (what == "strand" and abs(by.x()) > face.look.px(5)):
            self._press = ("pan", start, at)
            self.show_stretch(*(one - (at.x() - last.x()) * face.per_px for one in self.shown))

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Let go."""
        press, self._press = self._press, None
        if press is None or event.button() != Qt.MouseButton.LeftButton:
            return
        held, face = self._held, self._face()
        if press[0] == "knot" and held is not None:
            self._let_go(True)
            if not held.moved:
                self.knot_clicked.emit(held.segment, held.was_s)
        elif press[0] == "strand" and face is not None:
            self._put_head(face.s_of(self._at(event.position()).x()))

    def wheelEvent(self, event: QWheelEvent) -> None:
        """The wheel zooms about the pointer, with Shift or two fingers it scrolls."""
        face = self._face()
        if face is None:
            return
        event.accept()
        turn, fine, length = event.angleDelta(), event.pixelDelta(), self._to_s - self._from_s
        if not fine.isNull() and event.phase() != Qt.ScrollPhase.NoScrollPhase:
            by = -fine.x() * self.devicePixelRatioF() * face.per_px
        elif turn.x() or event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            by = -(turn.x() or turn.y()) / 1200.0 * length
        else:
            self._zoom(0.85 ** (turn.y() / 120.0), face.s_of(self._at(event.position()).x()))
            return
        self.show_stretch(self._from_s + by, self._to_s + by)

    def _zoom(self, factor: float, about_s: float) -> None:
        self.show_stretch(about_s - (about_s - self._from_s) * factor, about_s + (self._to_s - about_s) * factor)

    def _put_head(self, at_s: float) -> None:
        self._head_s = min(max(at_s, 0.0), self._weave.to_s if self._weave else 0.0)
        self.head_moved.emit(self._head_s)
        self.update()

    # Keys.

    def focusNextPrevChild(self, forward: bool) -> bool:
        """Tab goes through the knots, then on to the next part of the window."""
        if self._held is None and self._touring and self._knots is not None:
            count = len(self._knots.segment)
            to = (self._chosen + 1 if self._chosen >= 0 else 0) if forward else self._chosen - 1
            if 0 <= to < count and (forward or self._chosen >= 0):
                self._choose(to)
                return True
        self._chosen, self._touring = -1, True
        self.update()
        return super().focusNextPrevChild(forward)

    def _choose(self, knot: int) -> None:
        assert self._knots is not None and self._weave is not None and self._fiber is not None
        self._chosen = knot
        at, length = float(self._knots.at_s[knot]), self._to_s - self._from_s
        if not self._from_s <= at <= self._to_s:
            self.show_stretch(at - length / 2, at + length / 2)
        words = in_words(self._weave.abilities, self._fiber, float(self._knots.strain[knot]))
        self.setAccessibleDescription(f"knot {knot + 1} at {self._weave.tempo.say_place(at)}: {words}")
        self.update()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Tab to a knot, Enter to take hold, arrows to move it by the grid, Enter to let go, Escape to put it back."""
        if self._weave is None or self._fiber is None or not self._key(event):
            super().keyPressEvent(event)

    def _key(self, event: QKeyEvent) -> bool:
        assert self._weave is not None and self._fiber is not None
        key, held = event.key(), self._held
        free = bool(event.modifiers() & Qt.KeyboardModifier.AltModifier)
        sideways = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}.get(key, 0)
        upright = {Qt.Key.Key_Up: 1, Qt.Key.Key_Down: -1}.get(key, 0)
        enter = key in (Qt.Key.Key_Return, Qt.Key.Key_Enter)
        tempo, length = self._weave.tempo, self._to_s - self._from_s
        if held is not None:
            if sideways and held.way != "target":
                step = held.at_s + sideways * FREE_STEP_S
                on = float(tempo.seconds(max(float(tempo.counts(held.at_s)) + sideways * self._grid, 0.0)))
                self._carry_time(step if free else on, free)
            elif upright and held.way != "time":
                stroke = float(self._weave.abilities.stroke[self._fiber])
                self._carry_target(held.strain + upright * stroke * (FREE_STEP_SHARE if free else self._targets), free)
            elif enter or key == Qt.Key.Key_Escape:
                self._let_go(enter)
            return bool(sideways or upright or enter or key == Qt.Key.Key_Escape)
        if sideways and event.modifiers() & Qt.KeyboardModifier.ShiftModifier:
            self.show_stretch(self._from_s + sideways * length / 8, self._to_s + sideways * length / 8)
        elif sideways:
            self._put_head(float(tempo.seconds(max(float(tempo.counts(self._head_s)) + sideways * self._grid, 0.0))))
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal, Qt.Key.Key_Minus):
            middle = self._head_s if self._from_s <= self._head_s <= self._to_s else (self._from_s + self._to_s) / 2
            self._zoom(1 / 0.7 if key == Qt.Key.Key_Minus else 0.7, middle)
        elif key == Qt.Key.Key_0:
            self.show_stretch(0.0, self._weave.to_s)
        elif key in (Qt.Key.Key_Home, Qt.Key.Key_End):
            self._put_head(0.0 if key == Qt.Key.Key_Home else self._weave.to_s)
        elif enter and self._chosen >= 0:
            self._grab(self._chosen)
        elif key == Qt.Key.Key_Escape and self._chosen >= 0:
            self._chosen, self._touring = -1, False
            self.update()
        else:
            return False
        return True
