"""Which part of a cloth is in view: scrolling and zooming in time and in threads, and where that leaves everything."""

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QResizeEvent
from PySide6.QtWidgets import QScrollBar, QWidget

from composer.picture.cloth.view import BAR_PX, NARROWEST_S, View, laid_out, most_zoom
from composer.picture.cloth.weave import Weave
from composer.picture.image import Rows, rows_of
from composer.picture.look import Look
from composer.picture.palette import DARK, Theme
from composer.picture.scene import Stretch

STEPS = 1_000_000
"""Steps of a scroll bar over its whole."""
SAME_S = 1e-9
"""A stretch that differs by less is the same: two views that follow one another must not chase a rounding."""


class ClothPlace(QWidget):
    """What a cloth knows of its place in the score. stretch_changed(from_s, to_s): another stretch of time is shown."""

    stretch_changed = Signal(float, float)

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent)
        self._theme = theme
        self._weave: Weave | None = None
        self._from_s, self._to_s = 0.0, 1.0
        self._reach_s = 0.0
        self._zoom, self._place = 1.0, 0.0
        self._rows: tuple[tuple[object, int, int], Rows] | None = None
        self._view: View | None = None
        self._along = QScrollBar(Qt.Orientation.Horizontal, self)
        self._across = QScrollBar(Qt.Orientation.Vertical, self)
        for bar, name in ((self._along, "scroll in time"), (self._across, "scroll in threads")):
            bar.setAccessibleName(name)
            bar.setFocusPolicy(Qt.FocusPolicy.NoFocus)
            bar.hide()
            bar.valueChanged.connect(self._scrolled)
        self._style_bars()

    @property
    def weave(self) -> Weave | None:
        """What is shown."""
        return self._weave

    def _redraw(self) -> None:
        """Everything is to be drawn anew."""
        self._view = None
        self.update()

    @property
    def shown(self) -> tuple[float, float]:
        """The stretch of time shown, in s."""
        return self._from_s, self._to_s

    @property
    def zoom(self) -> float:
        """How much higher than the window all threads are together; 1 where all are shown."""
        return self._zoom

    @property
    def _end_s(self) -> float:
        """The end of all that can be shown: the score's, or that of what would be instead, where it is later."""
        return max(self._weave.to_s, self._reach_s) if self._weave else 1.0

    def reach(self, end_s: float) -> None:
        """Something may be shown up to there, also beyond the score's end; who saw all before sees all then."""
        all_seen = self._weave is not None and self._from_s <= 0.0 and self._to_s >= self._end_s - SAME_S
        before, self._reach_s = self._end_s, end_s
        if self._end_s != before:
            self.show_stretch(*((0.0, self._end_s) if all_seen else self.shown))

    def show_stretch(self, from_s: float, to_s: float) -> None:
        """Show a stretch of time, moved and shortened so that it lies within the whole."""
        whole = self._end_s
        length = min(max(to_s - from_s, min(NARROWEST_S, whole)), whole)
        begin = min(max(from_s, 0.0), whole - length)
        if abs(begin - self._from_s) > SAME_S or abs(begin + length - self._to_s) > SAME_S:
            self._from_s, self._to_s = begin, begin + length
            self._redraw()
            self.stretch_changed.emit(self._from_s, self._to_s)

    def show_all(self) -> None:
        """Show the whole score and all threads."""
        self._zoom, self._place = 1.0, 0.0
        self.show_stretch(0.0, self._end_s)
        self._redraw()

    def zoom_time(self, factor: float, about_s: float) -> None:
        """Show `factor` times as long a stretch; the instant `about_s` stays where it is."""
        self.show_stretch(about_s - (about_s - self._from_s) * factor, about_s + (self._to_s - about_s) * factor)

    def zoom_threads(self, factor: float, about: float = 0.5) -> None:
        """Make all threads `factor` times as high; what lies at the share `about` of the window stays where it is."""
        view = self._current()
        if view is None or self._weave is None:
            return
        at = (view.scroll + about * view.plan.room) / max(view.rows.height, 1)
        self._zoom = min(max(self._zoom * factor, 1.0), most_zoom(view.look, view.plan.room, self._weave.tracks.fibers))
        self._view = None
        view = self._current()
        assert view is not None
        self._place = max(at - about * view.plan.room / max(view.rows.height, 1), 0.0)
        self._redraw()

    def scroll_time(self, by_s: float) -> None:
        """Move along in time."""
        whole, length = self._end_s, self._to_s - self._from_s
        begin = min(max(self._from_s + by_s, 0.0), whole - length)
        self.show_stretch(begin, begin + length)

    def scroll_threads(self, by_px: float) -> None:
        """Move across the threads, by pixels of the screen."""
        view = self._current()
        if view is not None:
            most = max(view.rows.height - view.plan.room, 0)
            self._place = min(max(view.scroll + by_px, 0.0), most) / max(view.rows.height, 1)
            self._redraw()

    def reveal(self, stretch: Stretch) -> None:
        """Bring a stretch of a thread into view, moving no more than it takes."""
        length = self._to_s - self._from_s
        if stretch.to_s - stretch.from_s > length or not self._from_s <= stretch.from_s <= stretch.to_s <= self._to_s:
            room = max(length, 1.5 * (stretch.to_s - stretch.from_s))
            middle = (stretch.from_s + stretch.to_s) / 2
            self.show_stretch(middle - room / 2, middle + room / 2)
        if stretch.fiber is not None:
            self._reveal_fiber(stretch.fiber)

    def _reveal_fiber(self, fiber: int) -> None:
        view = self._current()
        if view is None or not 0 <= fiber < len(view.rows.top):
            return
        top, bottom = view.rows.top[fiber] - view.scroll, view.rows.bottom[fiber] - view.scroll
        if top < 0 or bottom > view.plan.room:
            self.scroll_threads(float((top + bottom) / 2 - view.plan.room / 2))

    # Where everything lies.

    def _look(self) -> Look:
        size = self.fontInfo().pixelSize()
        return Look(self.devicePixelRatioF() * max(size, 8) / 13.0, self._theme)

    def _rows_in(self, height: int, widest: int) -> Rows:
        assert self._weave is not None
        key = (self._weave.bands, height, widest)
        if self._rows is None or self._rows[0] != key:
            self._rows = (key, rows_of(self._weave.bands, height, widest))
        return self._rows[1]

    def _current(self) -> View | None:
        """The view as things stand, in pixels of the screen."""
        if self._weave is None:
            return None
        if self._view is None:
            scale = self.devicePixelRatioF()
            width, height = (max(1, round((side - BAR_PX) * scale)) for side in (self.width(), self.height()))
            self._view = laid_out(
                self._look(), width, height, self._rows_in, len(self._weave.lanes), self._zoom, self._place, self._from_s,
                self._to_s,
            )  # fmt: skip
        return self._view

    def _place_bars(self, view: View) -> None:
        """Scroll bars say where in the whole the window is."""
        whole = self._end_s
        length = self._to_s - self._from_s
        page = round(length / whole * STEPS)
        _set(self._along, STEPS - page, page, round(self._from_s / whole * STEPS))
        room = min(view.plan.room, view.rows.height)
        _set(self._across, view.rows.height - room, room, view.scroll)

    def _scrolled(self, value: int) -> None:
        view = self._current()
        if view is None or self._weave is None:
            return
        if self.sender() is self._along:
            begin = value / STEPS * self._end_s
            self.show_stretch(begin, begin + self._to_s - self._from_s)
        else:
            self.scroll_threads(value - view.scroll)

    def _style_bars(self) -> None:
        ground, raised, edge = ("rgb({}, {}, {})".format(*getattr(self._theme, name)) for name in ("ground", "raised", "edge"))
        for bar in (self._along, self._across):
            bar.setStyleSheet(
                f"QScrollBar {{ background: {ground}; border: none; }}"
                f"QScrollBar::handle {{ background: {edge}; border: 3px solid {ground}; min-width: 24px; min-height: 24px; }}"
                f"QScrollBar::handle:hover {{ border-color: {raised}; }}"
                "QScrollBar::add-line, QScrollBar::sub-line { width: 0; height: 0; }"
                "QScrollBar::add-page, QScrollBar::sub-page { background: none; }"
            )

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A new size wants a new picture."""
        wide, high = self.width() - BAR_PX, self.height() - BAR_PX
        self._along.setGeometry(0, high, wide, BAR_PX)
        self._across.setGeometry(wide, 0, BAR_PX, high)
        self._redraw()


def _set(bar: QScrollBar, most: int, page: int, value: int) -> None:
    bar.blockSignals(True)
    bar.setRange(0, max(most, 0))
    bar.setPageStep(max(page, 1))
    bar.setSingleStep(max(page // 10, 1))
    bar.setValue(value)
    bar.blockSignals(False)
    bar.setVisible(most > 0)
