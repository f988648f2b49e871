"""One fiber's strand under hands: knots that can be dragged, by mouse and by keys; the text is changed elsewhere."""

from dataclasses import replace

import numpy as np
from PySide6.QtCore import QPointF, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QWheelEvent
from PySide6.QtWidgets import QWidget

from composer.picture.palette import DARK, Theme
from composer.picture.strand.paint import Face
from composer.picture.strand.show import Held, StrandShow
from composer.picture.units import in_words

NEAR_PX = 9
"""How near to a knot, in pixels at scale 1, a press takes hold of it."""
FREE_STEP_S = 0.005
FREE_STEP_SHARE = 0.001
"""How far an arrow moves a knot off the grid: a tick of the player, a thousandth of stroke."""

KEYS: tuple[tuple[str, str], ...] = (
    ("← →", "play head along by the grid; with Shift the strand scrolls"),
    ("+ −", "zoom in time about the play head"),
    ("0", "show all"),
    ("Home, End", "play head to the start or the end"),
    ("Tab, Shift+Tab", "next or previous knot; beyond the last to the next part of the window"),
    ("Enter", "take hold of the knot, then let it go where it is"),
    ("← → with a knot held", "move it in time by the grid; with Alt by 5 ms off the grid"),
    ("↑ ↓ with a knot held", "move its target by the grid; with Alt by a thousandth of stroke"),
    ("Esc", "put a held knot back; leave the knots"),
)
"""What each key does, for a sheet of keys."""


class StrandView(StrandShow):
    """A strand whose knots can be dragged: whichever way one sets out, that number alone is changed.

    time_dragged(segment, seconds, free): a knot is being moved in time; on the grid unless `free`
    target_dragged(segment, strain, free): a knot's target is being moved; on the grid of targets unless `free`
    knot_dropped(kept): it was let go; where not `kept`, the drag signal has just put it back
    knot_clicked(segment, seconds): a knot was clicked, without being moved
    head_moved(seconds): the play head was put somewhere by hand
    """

    time_dragged = Signal(int, float, bool)
    target_dragged = Signal(int, float, bool)
    knot_dropped = Signal(bool)
    knot_clicked = Signal(int, float)
    head_moved = Signal(float)

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent, theme)
        self._touring = True
        self._press: tuple[str, QPointF, QPointF] | None = None

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
            self.show_stretch(0.0, self._end_s)
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
