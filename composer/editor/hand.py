"""A hit or a knot under the hand: the worker is asked at each step what the text would be, and at the end that is done."""

from collections.abc import Callable
from fractions import Fraction
from typing import Any

from PySide6.QtCore import QObject, Signal

from composer.editor.messages import Dragged
from composer.edits.edit import Edit, Refusal


class Hand(QObject):
    """Drags, one at a time. One question is under way at most; while it is, only the newest place is remembered.

    moved: what would come of it (a `Dragged`), while it is carried; dropped: the edit, when it is let go
    refused: why it cannot go there; ended: nothing is carried any more
    """

    moved = Signal(object)
    dropped = Signal(object)
    refused = Signal(str)
    ended = Signal()

    def __init__(self, ask: Callable[[str, tuple[Any, ...], Callable[[Any], None]], None], parent: QObject | None = None):
        super().__init__(parent)
        self._ask = ask
        self._wanted: tuple | None = None
        self._asking = False
        self._last: Edit | None = None
        self._let_go: bool | None = None
        self.grid = Fraction(1, 4)

    @property
    def carries(self) -> bool:
        """Whether something is under way."""
        return self._asking or self._last is not None

    def carry(self, segment: int, time_s: float | None, strain: float | None, free: bool) -> None:
        """It is there now."""
        self._let_go = None
        self._wanted = (segment, time_s, strain, self.grid, free)
        self._next()

    def let_go(self, kept: bool) -> None:
        """It stays there, or goes back."""
        self._let_go = kept
        if not kept:
            self._wanted = None
        if not self._asking:
            self._end()

    def forget(self) -> None:
        """The text has changed under it: nothing is done."""
        self._wanted, self._asking, self._last, self._let_go = None, False, None, None
        self.ended.emit()

    def _next(self) -> None:
        if self._asking or self._wanted is None:
            return
        wanted, self._wanted = self._wanted, None
        self._asking = True
        self._ask("drag", wanted, self._heard)

    def _heard(self, answer: Dragged | Refusal | None) -> None:
        self._asking = False
        if isinstance(answer, Dragged):
            self._last = answer.edit
            if self._let_go is None:
                self.moved.emit(answer)
        elif isinstance(answer, Refusal):
            self._last = None
            self.refused.emit(answer.say)
        if self._wanted is not None:
            self._next()
        elif self._let_go is not None:
            self._end()

    def _end(self) -> None:
        edit, kept = self._last, self._let_go
        self._last, self._let_go, self._wanted = None, None, None
        if kept and edit is not None and edit.changes:
            self.dropped.emit(edit)
        self.ended.emit()
