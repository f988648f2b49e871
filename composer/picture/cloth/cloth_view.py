"""The living cloth by keys: everything that the mouse does, and a way through snags and hits."""

import numpy as np
from PySide6.QtCore import Qt
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import QWidget

from composer.picture.cloth.hand import ClothHand
from composer.picture.palette import DARK, Theme
from composer.picture.scene import Stretch

FREE_STEP_S = 0.005
"""How far an arrow moves a hit off the grid: a tick of the player."""

KEYS: tuple[tuple[str, str], ...] = (
    ("← →", "play head along by the grid; with Ctrl by a bar, with Shift the cloth scrolls"),
    ("↑ ↓", "the thread above or below; with Shift the cloth scrolls, with Ctrl threads grow or shrink"),
    ("Page up, Page down", "a window back or on in time"),
    ("+ −", "zoom in time about the play head"),
    ("0", "show all"),
    ("Home, End", "play head to the start or the end"),
    ("Tab, Shift+Tab", "next or previous snag, and hit of the thread; beyond the last to the next part of the window"),
    ("Enter", "on a hit: take hold of it, then let it go where it is; on a snag: choose it; else: the thread's line"),
    ("← → with a hit held", "move it by the grid; with Alt by 5 ms off the grid"),
    ("Esc", "put a held hit back; leave snags and hits"),
)
"""What each key does, for a sheet of keys."""


class ClothView(ClothHand):
    """A cloth that is clicked, dragged and played on by keys: signals and setters of `ClothHand`, `ClothShow`, `ClothPlace`."""

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent, theme)
        self._touring = True

    def focusNextPrevChild(self, forward: bool) -> bool:
        """Tab goes through the snags and the thread's hits, then on to the next part of the window."""
        if self._held is None and self._touring and self._next_mark(forward):
            return True
        self._touring = True
        return super().focusNextPrevChild(forward)

    def _next_mark(self, forward: bool) -> bool:
        """Go to the next snag or hit in time; False where there is none."""
        if self._weave is None or self._shown is None:
            return False
        shown, hits = self._shown, self._shown.hits
        mine = np.flatnonzero(hits.fiber == (-1 if shown.fiber is None else shown.fiber))
        begins = shown.marks[1]
        at = np.concatenate([begins, hits.at_s[mine]])
        which = np.concatenate([np.arange(len(begins)), mine])
        is_hit = np.arange(len(at)) >= len(begins)
        order = np.lexsort((which, is_hit, at))
        here = np.flatnonzero(np.where(is_hit, which == shown.hit, which == shown.snag)[order])
        place = (0 if forward else -1) if not len(here) else int(here[0]) + (1 if forward else -1)
        if not 0 <= place < len(order):
            self._change(snag=-1, hit=-1)
            return False
        mark = order[place]
        index, at_s = int(which[mark]), float(at[mark])
        if not is_hit[mark]:
            self.choose_snag(index)
            self._tell(f"snag {index + 1} of {len(self._weave.snags)} at {self.say_time(at_s)}")
        else:
            self._change(hit=index, snag=-1)
            self.reveal(Stretch(int(hits.fiber[index]), at_s, at_s))
            self._tell(f"hit of {self._weave.names[int(hits.fiber[index])]} at {self.say_time(at_s)}")
        return True

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Everything that the mouse does, by key."""
        if self._weave is None or not (self._held_key(event) if self._held is not None else self._free_key(event)):
            super().keyPressEvent(event)

    def _held_key(self, event: QKeyEvent) -> bool:
        key, held = event.key(), self._held
        assert held is not None
        if key in (Qt.Key.Key_Left, Qt.Key.Key_Right):
            way = 1 if key == Qt.Key.Key_Right else -1
            if event.modifiers() & Qt.KeyboardModifier.AltModifier:
                self._carry(held.now_s + way * FREE_STEP_S, True)
            else:
                self._carry(self._stepped(held.now_s, way), False)
            self.reveal(Stretch(held.fiber, self._held.now_s, self._held.now_s))  # type: ignore[union-attr]
        elif key in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self._let_go(True)
        elif key == Qt.Key.Key_Escape:
            self._let_go(False)
        else:
            return False
        return True

    def _free_key(self, event: QKeyEvent) -> bool:
        key, held = event.key(), event.modifiers()
        shift, control = (bool(held & one) for one in (Qt.KeyboardModifier.ShiftModifier, Qt.KeyboardModifier.ControlModifier))
        length = self._to_s - self._from_s
        middle = self._head_s if self._from_s <= self._head_s <= self._to_s else (self._from_s + self._to_s) / 2
        assert self._weave is not None
        sideways = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}.get(key, 0)
        upright = {Qt.Key.Key_Up: -1, Qt.Key.Key_Down: 1}.get(key, 0)
        if sideways:
            if shift:
                self.scroll_time(sideways * length / 8)
            else:
                self._move_head(self._by_bar(sideways) if control else self._stepped(self._head_s, sideways))
        elif upright:
            view = self._current()
            if shift and view is not None:
                self.scroll_threads(upright * view.plan.room / 8)
            elif control:
                self.zoom_threads(1.25**-upright)
            else:
                self._move_fiber(upright)
        elif key in (Qt.Key.Key_PageUp, Qt.Key.Key_PageDown):
            self.scroll_time(length * 0.9 * (1 if key == Qt.Key.Key_PageDown else -1))
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self.zoom_time(0.7, middle)
        elif key == Qt.Key.Key_Minus:
            self.zoom_time(1 / 0.7, middle)
        elif key == Qt.Key.Key_0:
            self.show_all()
        elif key in (Qt.Key.Key_Home, Qt.Key.Key_End):
            self._move_head(0.0 if key == Qt.Key.Key_Home else self._weave.to_s)
        elif key in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            return self._enter()
        elif key == Qt.Key.Key_Escape and self._shown is not None and (self._shown.snag >= 0 or self._shown.hit >= 0):
            self._change(snag=-1, hit=-1)
            self._touring = False
        else:
            return False
        return True

    def _by_bar(self, way: int) -> float:
        assert self._weave is not None
        tempo = self._weave.tempo
        bars = float(tempo.bars(tempo.counts(self._head_s)))
        goal = np.floor(bars + 1e-6) + 1 if way > 0 else np.ceil(bars - 1e-6) - 1
        return float(tempo.seconds(tempo.counts_of_bars(max(goal, 0.0))))

    def _move_head(self, at_s: float) -> None:
        self._put_head(at_s)
        length = self._to_s - self._from_s
        if not self._from_s <= self._head_s <= self._to_s:
            self.show_stretch(self._head_s - length / 2, self._head_s + length / 2)

    def _move_fiber(self, by: int) -> None:
        assert self._weave is not None
        count, now = self._weave.tracks.fibers, self.fiber
        if count:
            fiber = (0 if by > 0 else count - 1) if now is None else min(max(now + by, 0), count - 1)
            self._change(hit=-1)
            self.choose_fiber(fiber)
            self._tell(self.describe(fiber, self._head_s))

    def _enter(self) -> bool:
        assert self._shown is not None
        if self._shown.hit >= 0:
            self._grab(self._shown.hit)
        elif self._shown.snag >= 0:
            self.snag_chosen.emit(self._shown.snag)
        elif self._shown.fiber is not None:
            self.thread_clicked.emit(self._shown.fiber, self._head_s)
        else:
            return False
        return True
