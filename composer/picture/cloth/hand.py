"""The living cloth under the mouse: what is asked for goes out as signals, the text is changed elsewhere."""

from dataclasses import dataclass
from math import nextafter

import numpy as np
from PySide6.QtCore import QEvent, QPointF, Qt, Signal
from PySide6.QtGui import QMouseEvent, QNativeGestureEvent, QPainter, QWheelEvent
from PySide6.QtWidgets import QToolTip, QWidget

from composer.picture.axes import grid_lines
from composer.picture.cloth import over
from composer.picture.cloth.hits import moved_together, nearest
from composer.picture.cloth.sampling import sampler_of
from composer.picture.cloth.show import ClothShow
from composer.picture.cloth.view import View
from composer.picture.cloth.weave import Weave
from composer.picture.palette import DARK, Theme
from composer.picture.units import in_words

NEAR_PX = 7
"""How near to a hit, in pixels at scale 1, a press takes hold of it; and how far a press moves before it drags."""
GRID_PX = 8
"""How far apart the lines of a grid are drawn at least."""


@dataclass(frozen=True, slots=True)
class Held:
    """A hit under the hand: the segment that lands, its fiber, where it was and is; whether it is off the grid."""

    segment: int
    fiber: int
    was_s: float
    now_s: float
    free: bool
    moved: bool = False


class ClothHand(ClothShow):
    """A cloth that can be clicked and dragged.

    thread_clicked(fiber, seconds): a thread was chosen at an instant, that of a hit as the last of the move that lands there;
        comes before `snag_chosen` where there is a snag too
    snag_chosen(index): a snag, by its index in the weave
    hit_dragged(segment, seconds, free): a hit is being moved there; `seconds` is on the grid unless `free`
    hit_dropped(kept): the hit was let go; where not `kept`, `hit_dragged` has just put it back
    """

    thread_clicked = Signal(int, float)
    snag_chosen = Signal(int)
    hit_dragged = Signal(int, float, bool)
    hit_dropped = Signal(bool)

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent, theme)
        self._grid = 0.25
        self._held: Held | None = None
        self._press: tuple[str, QPointF, QPointF] | None = None

    # Grid.

    def set_grid(self, counts: float) -> None:
        """The grid that hits snap to, in counts: 1/4 unless set."""
        if not counts > 0.0:
            raise ValueError(f"a grid of {counts} counts; it must be more than 0")
        self._grid = float(counts)
        self.update()

    def on_grid(self, at_s: float) -> float:
        """The instant of the grid that is nearest, never before the start."""
        return self._stepped(at_s, 0)

    def _stepped(self, at_s: float, steps: int) -> float:
        """The instant so many lines of the grid on; the nearest line for 0."""
        assert self._weave is not None
        tempo = self._weave.tempo
        place = float(tempo.counts(at_s)) / self._grid
        line = round(place) if steps == 0 else np.floor(place + 1e-6) + steps if steps > 0 else np.ceil(place - 1e-6) + steps
        return max(float(tempo.seconds(max(line, 0) * self._grid)), 0.0)

    # A hit under the hand.

    @property
    def holds(self) -> bool:
        """Whether a hit is held, by mouse or keys."""
        return self._held is not None

    def set_weave(self, weave: Weave | None) -> None:
        """As `ClothShow`; a held hit stays in the hand as long as the score has as many segments as before."""
        before = self._weave
        super().set_weave(weave)
        if self._held is not None and (
            weave is None or before is None or len(weave.tracks.time_s) != len(before.tracks.time_s)
        ):
            self._held = None

    def _grab(self, hit: int) -> None:
        assert self._shown is not None and self._weave is not None
        segment, fiber, at = (getattr(self._shown.hits, name)[hit] for name in ("segment", "fiber", "at_s"))
        self._held = Held(int(segment), int(fiber), float(at), float(at), False)
        self._change(hit=hit, fiber=int(fiber), snag=-1)
        self.set_lit(moved_together(self._weave.tracks, int(segment)))
        self._tell(f"holding a hit of {self._weave.names[int(fiber)]} at {self.say_time(float(at))}")

    def _carry(self, at_s: float, free: bool) -> None:
        held = self._held
        assert held is not None
        now = max(at_s, 0.0) if free else self.on_grid(at_s)
        if now != held.now_s:
            self._held = Held(held.segment, held.fiber, held.was_s, now, free, True)
            self.hit_dragged.emit(held.segment, now, free)
            self._tell(f"hit at {self.say_time(now)}")
        self.update()

    def _let_go(self, kept: bool) -> None:
        held, self._held = self._held, None
        if held is None:
            return
        if not kept and held.moved:
            self.hit_dragged.emit(held.segment, held.was_s, True)
        self.set_lit(None)
        self.hit_dropped.emit(kept and held.moved)
        self._tell("let go" if kept else "put back")

    def _paint_moving(self, painter: QPainter, view: View) -> None:
        held = self._held
        if held is None or self._weave is None or held.fiber >= self._weave.tracks.fibers:
            return
        apart = view.look.px(GRID_PX)
        grid = grid_lines(self._weave.tempo, self._grid, view.from_s, view.to_s, view.per_px, apart)
        words = self.say_time(held.now_s) + (", off the grid" if held.free else "")
        over.dragged(painter, view, held.fiber, held.was_s, held.now_s, words, grid)

    # Mouse.

    def _at(self, place: QPointF) -> QPointF:
        return place * self.devicePixelRatioF()

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Take hold: of a hit, of the play head on the rulers, of the cloth itself."""
        view, at = self._current(), self._at(event.position())
        if view is None or event.button() != Qt.MouseButton.LeftButton or self._held is not None:
            return
        if view.in_rulers(at.x(), at.y()):
            self._press = ("head", at, at)
            self._put_head(view.s_of(at.x()))
            return
        hit = self._hit_near(view, at)
        if hit >= 0:
            self._press = ("hit", at, at)
            self._grab(hit)
        else:
            self._press = ("cloth", at, at)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Carry what is held; without a press, show what could be taken hold of."""
        view, at = self._current(), self._at(event.position())
        if view is None:
            return
        if self._press is None:
            self._show_hand(view, at)
            return
        what, start, last = self._press
        if what == "head":
            self._put_head(view.s_of(at.x()))
        elif what == "hit" and self._held is not None:
            if self._held.moved or abs(at.x() - start.x()) > view.look.px(3):
                by = (at.x() - start.x()) * view.per_px
                self._carry(self._held.was_s + by, bool(event.modifiers() & Qt.KeyboardModifier.AltModifier))
        elif what == "pan" or (at - start).manhattanLength() > view.look.px(NEAR_PX):
            self.setCursor(Qt.CursorShape.ClosedHandCursor)
            self._press = ("pan", start, at)
            self.scroll_time(-(at.x() - last.x()) * view.per_px)
            self.scroll_threads(-(at.y() - last.y()))

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        """Let go; a press that has not moved is a click."""
        if event.button() != Qt.MouseButton.LeftButton:
            return
        press, self._press = self._press, None
        self.unsetCursor()
        view, at = self._current(), self._at(event.position())
        if press is None or view is None:
            return
        if press[0] == "hit":
            held = self._held
            self._let_go(True)
            if held is not None and not held.moved:
                # At its instant the next move begins; the hit is the end of the move before.
                self.thread_clicked.emit(held.fiber, nextafter(held.was_s, 0.0))
        elif press[0] == "cloth":
            self._click(view, at)

    def _click(self, view: View, at: QPointF) -> None:
        fiber = view.fiber_at(at.y())
        if fiber is None or self._weave is None:
            return
        seconds = min(max(view.s_of(at.x()), 0.0), self._weave.to_s)
        self._change(fiber=fiber, hit=-1)
        if not view.in_cloth(at.x(), at.y()):
            seconds = self._head_s
        self.thread_clicked.emit(fiber, seconds)
        snag = self._snag_at(view, fiber, seconds) if view.in_cloth(at.x(), at.y()) else -1
        self._change(snag=snag)
        if snag >= 0:
            self.snag_chosen.emit(snag)

    def _hit_near(self, view: View, at: QPointF) -> int:
        if self._shown is None or not view.in_cloth(at.x(), at.y()) or over.hits_shown(view, self._shown.hits) is None:
            return -1
        fiber = view.fiber_at(at.y())
        return -1 if fiber is None else nearest(self._shown.hits, fiber, view.s_of(at.x()), view.look.px(NEAR_PX) * view.per_px)

    def _snag_at(self, view: View, fiber: int, seconds: float) -> int:
        assert self._shown is not None
        near = view.look.px(3) * view.per_px
        of, begin, end = self._shown.marks
        found = np.flatnonzero((of == fiber) & (begin - near <= seconds) & (seconds <= end + near))
        return int(found[np.argmin((end - begin)[found])]) if len(found) else -1

    def _show_hand(self, view: View, at: QPointF) -> None:
        if view.in_rulers(at.x(), at.y()) or self._hit_near(view, at) >= 0:
            self.setCursor(Qt.CursorShape.SizeHorCursor)
        else:
            self.unsetCursor()

    def _put_head(self, at_s: float) -> None:
        self.set_head(at_s)
        self.head_moved.emit(self._head_s)
        self._tell(f"play head at {self.say_time(self._head_s)}")

    def wheelEvent(self, event: QWheelEvent) -> None:
        """The wheel zooms in time about the pointer, with Ctrl in threads; with Shift, or two fingers, it scrolls."""
        view, at = self._current(), self._at(event.position())
        if view is None:
            return
        event.accept()
        turn, fine = event.angleDelta(), event.pixelDelta()
        held = event.modifiers()
        scale = self.devicePixelRatioF()
        if held & Qt.KeyboardModifier.ControlModifier:
            self.zoom_threads(1.2 ** (turn.y() / 120.0), min(max((at.y() - view.plan.top) / view.plan.room, 0.0), 1.0))
        elif not fine.isNull() and event.phase() != Qt.ScrollPhase.NoScrollPhase:
            self.scroll_time(-fine.x() * scale * view.per_px)
            self.scroll_threads(-fine.y() * scale)
        elif at.x() < view.plan.left:
            self.scroll_threads(-turn.y() / 120.0 * view.look.px(40))
        elif turn.x() or held & Qt.KeyboardModifier.ShiftModifier:
            self.scroll_time(-(turn.x() or turn.y()) / 1200.0 * (self._to_s - self._from_s))
        else:
            self.zoom_time(
                0.85 ** (turn.y() / 120.0), view.s_of(min(max(at.x(), view.plan.left), view.plan.left + view.plan.width))
            )

    def event(self, event: QEvent) -> bool:
        """Pinching zooms; resting on a thread tells what it is."""
        if isinstance(event, QNativeGestureEvent) and event.gestureType() == Qt.NativeGestureType.ZoomNativeGesture:
            view = self._current()
            if view is not None:
                self.zoom_time(1.0 / max(1.0 + event.value(), 0.2), view.s_of(self._at(event.position()).x()))
            return True
        if event.type() == QEvent.Type.ToolTip:
            self._tip(event)
            return True
        return super().event(event)

    def _tip(self, event: QEvent) -> None:
        view = self._current()
        at = self._at(QPointF(event.pos()))  # type: ignore[attr-defined]
        fiber = view.fiber_at(at.y()) if view is not None and view.in_cloth(at.x(), at.y()) else None
        if view is None or fiber is None:
            QToolTip.hideText()
            return
        QToolTip.showText(event.globalPos(), self.describe(fiber, view.s_of(at.x())), self)  # type: ignore[attr-defined]

    def describe(self, fiber: int, at_s: float) -> str:
        """A thread at an instant in words: its name, the place, its strain in real units."""
        assert self._weave is not None
        sampler = sampler_of(self._weave.tracks, self._weave.abilities)
        share = float(sampler.shares(np.array([fiber]), np.array([at_s]))[0, 0])
        strain = share * float(self._weave.abilities.stroke[fiber])
        said = f"{self._weave.names[fiber]} at {self.say_time(at_s)}: {in_words(self._weave.abilities, fiber, strain)}"
        view = self._current()
        if view is not None and self._snag_at(view, fiber, at_s) >= 0:
            said += ", a snag here"
        return said

    def _tell(self, words: str) -> None:
        self.setAccessibleDescription(words)
