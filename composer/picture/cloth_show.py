"""The living cloth as it is shown: what it holds, which part of it is in view, and how a frame is drawn."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import QImage, QPainter, QPaintEvent, QResizeEvent
from PySide6.QtWidgets import QScrollBar, QWidget

from composer.picture import over
from composer.picture.axes import say_seconds
from composer.picture.hits import hits_of
from composer.picture.image import Rows, extends, rows_of
from composer.picture.look import CENTRE, Look, colour, painting
from composer.picture.over import Shown
from composer.picture.palette import DARK, Theme
from composer.picture.sampling import Sampler, Source
from composer.picture.scene import Stretch
from composer.picture.tiling import Tiles
from composer.picture.view import BAR_PX, NARROWEST_S, View, laid_out, most_zoom
from composer.picture.weave import Weave
from composer.tracks import Tracks

FRAME_BUDGET_MS = 12
"""How long a frame may work on threads that are missing before it shows what there is."""
STEPS = 1_000_000
"""Steps of a scroll bar over its whole."""
NOTHING = "No score yet: what is written comes up here."


class ClothShow(QWidget):
    """A cloth that scrolls and zooms. All instants are seconds of the tracks shown; setters may be called at any time.

    head_moved(seconds): the play head was put somewhere by hand
    stretch_changed(from_s, to_s): another stretch of time is shown
    settled(): the picture is complete: nothing is still being worked out
    """

    head_moved = Signal(float)
    stretch_changed = Signal(float, float)
    settled = Signal()

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent)
        self._theme = theme
        self._weave: Weave | None = None
        self._shown: Shown | None = None
        self._source: Source | None = None
        self._sampler: Sampler | None = None
        self._from_s, self._to_s = 0.0, 1.0
        self._zoom, self._place = 1.0, 0.0
        self._head_s = 0.0
        self._rows: tuple[tuple[object, int, int], Rows] | None = None
        self._view: View | None = None
        self._still: QImage | None = None
        self._frame: QImage | None = None
        self._last: tuple[QImage, View] | None = None
        self._tiles = Tiles(self)
        self._tiles.grown.connect(self._grow)
        self._tiles.settled.connect(self.settled)
        self._along = QScrollBar(Qt.Orientation.Horizontal, self)
        self._across = QScrollBar(Qt.Orientation.Vertical, self)
        for bar, name in ((self._along, "scroll in time"), (self._across, "scroll in threads")):
            bar.setAccessibleName(name)
            bar.setFocusPolicy(Qt.FocusPolicy.NoFocus)
            bar.valueChanged.connect(self._scrolled)
        self._style_bars()
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMouseTracking(True)
        self.setMinimumSize(320, 200)
        self.setAttribute(Qt.WidgetAttribute.WA_OpaquePaintEvent)
        self.setAccessibleName("cloth")
        self.setAccessibleDescription(NOTHING)

    def sizeHint(self) -> QSize:
        """The size that it would like to have."""
        return QSize(960, 560)

    # What is shown.

    def set_weave(self, weave: Weave | None) -> None:
        """Show another score, or the same one changed: place, zoom and head stay. None: nothing can be shown."""
        before, self._weave = self._weave, weave
        if weave is None:
            self._shown = self._source = self._sampler = self._view = None
            self.setAccessibleDescription(NOTHING)
            self._redraw()
            return
        if before is None or weave.tracks is not before.tracks or weave.abilities is not before.abilities:
            self._sampler = Sampler(weave.tracks, weave.abilities)
            hits = hits_of(weave.tracks)
        else:
            assert self._shown is not None
            hits = self._shown.hits
        marks = over.marks_of(weave.snags)
        known = self._shown or Shown(weave, hits, marks)
        fiber = known.fiber if known.fiber is not None and known.fiber < weave.tracks.fibers else None
        keeps = before is not None and len(before.tracks.time_s) == len(weave.tracks.time_s)
        self._shown = replace(
            known, weave=weave, hits=hits, marks=marks, fiber=fiber, snag=-1,
            hit=known.hit if keeps else -1, lit=known.lit if keeps else known.lit[:0], ghost=None,
        )  # fmt: skip
        self._sources()
        count = weave.tracks.fibers
        self.setAccessibleName(f"cloth of {count} fiber{'s' * (count != 1)}")
        whole = before is None or (self._from_s <= 0.0 and self._to_s >= before.to_s)
        if whole:
            self._from_s, self._to_s = 0.0, weave.to_s
            self.stretch_changed.emit(self._from_s, self._to_s)
        else:
            self.show_stretch(self._from_s, self._to_s)
        self._redraw()

    def set_ghost(self, tracks: Tracks | None, words: tuple[str, str] = ("as written", "retimed")) -> None:
        """Show what would be instead, in the lower part of every thread that it changes, with arrows where hits move.

        words: what the threads are, and what the ghost is. `set_weave` takes the ghost away.
        """
        if self._shown is not None:
            self._shown = replace(self._shown, ghost=tracks, words=words)
            self._sources()
            self._redraw()

    def _sources(self) -> None:
        weave, shown = self._weave, self._shown
        if weave is None or shown is None or self._sampler is None:
            return
        ghost = shown.ghost
        if ghost is None or ghost.fibers != weave.tracks.fibers:
            self._source = Source(self._sampler, extends(weave.abilities))
        else:
            differs = differing(weave.tracks, ghost)
            self._source = Source(self._sampler, extends(weave.abilities), Sampler(ghost, weave.abilities), differs)

    def set_theme(self, theme: Theme) -> None:
        """Show it in other colours."""
        self._theme = theme
        self._last = None
        self._style_bars()
        self._redraw()

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

    def select(self, stretches: Sequence[Stretch]) -> None:
        """Light stretches of threads: those that the caret's line moves, say. None of them is scrolled to; see `reveal`."""
        self._change(selected=tuple(stretches))

    def set_lit(self, segments: np.ndarray | None) -> None:
        """Light segments (indices into the tracks), such as all that one number moves; None for none."""
        self._change(lit=np.empty(0, np.int64) if segments is None else np.asarray(segments, np.int64))

    def choose_snag(self, index: int | None) -> None:
        """Frame a snag and bring it into view; None for none."""
        self._change(snag=-1 if index is None else index, hit=-1)
        if index is not None and self._weave is not None and 0 <= index < len(self._weave.snags):
            self.reveal(self._weave.snags[index])

    def choose_fiber(self, fiber: int | None) -> None:
        """Put the keys on a thread, bring it into view."""
        self._change(fiber=fiber)
        if fiber is not None:
            self._reveal_fiber(fiber)

    def _change(self, **changes: object) -> None:
        if self._shown is not None:
            self._shown = replace(self._shown, **changes)  # type: ignore[arg-type]
            self._redraw()

    @property
    def fiber(self) -> int | None:
        """The thread that the keys are on."""
        return None if self._shown is None else self._shown.fiber

    @property
    def weave(self) -> Weave | None:
        """What is shown."""
        return self._weave

    @property
    def head_s(self) -> float:
        """Where the play head stands."""
        return self._head_s

    def set_head(self, at_s: float, follow: bool = False) -> None:
        """Put the play head at an instant, without `head_moved`; `follow` turns the page when it leaves the window."""
        self._head_s = min(max(at_s, 0.0), self._weave.to_s if self._weave else 0.0)
        if follow and not self._from_s <= self._head_s <= self._to_s:
            length = self._to_s - self._from_s
            self.show_stretch(self._head_s - 0.05 * length, self._head_s + 0.95 * length)
        self.update()

    # Which part is in view.

    @property
    def shown(self) -> tuple[float, float]:
        """The stretch of time shown, in s."""
        return self._from_s, self._to_s

    @property
    def zoom(self) -> float:
        """How much higher than the window all threads are together; 1 where all are shown."""
        return self._zoom

    @property
    def complete(self) -> bool:
        """Whether nothing of the picture is still being worked out."""
        return not self._tiles.busy

    def show_stretch(self, from_s: float, to_s: float) -> None:
        """Show a stretch of time, moved and shortened so that it lies within the whole."""
        whole = self._weave.to_s if self._weave else 1.0
        length = min(max(to_s - from_s, min(NARROWEST_S, whole)), whole)
        begin = min(max(from_s, 0.0), whole - length)
        if (begin, begin + length) != (self._from_s, self._to_s):
            self._from_s, self._to_s = begin, begin + length
            self._redraw()
            self.stretch_changed.emit(self._from_s, self._to_s)

    def show_all(self) -> None:
        """Show the whole score and all threads."""
        self._zoom, self._place = 1.0, 0.0
        self.show_stretch(0.0, self._weave.to_s if self._weave else 1.0)
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
        whole, length = self._weave.to_s if self._weave else 1.0, self._to_s - self._from_s
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

    # A frame.

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

    def _redraw(self) -> None:
        self._view = self._still = self._frame = None
        self.update()

    def _grow(self) -> None:
        """There are more threads to show; what lies round them stays."""
        self._still = None
        self.update()

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A new size wants a new picture."""
        wide, high = self.width() - BAR_PX, self.height() - BAR_PX
        self._along.setGeometry(0, high, wide, BAR_PX)
        self._across.setGeometry(wide, 0, BAR_PX, high)
        self._redraw()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw what stands still when it has changed, and what moves over it."""
        with painting(self) as painter:
            self._paint(painter)

    def _paint(self, painter: QPainter) -> None:
        scale = self.devicePixelRatioF()
        view = self._current()
        if view is None or self._shown is None:
            painter.fillRect(self.rect(), colour(self._theme.ground))
            look = replace(self._look(), scale=self._look().scale / scale)
            look.write(painter, QRectF(self.rect()), NOTHING, 13, self._theme.quiet_ink, CENTRE)
            return
        if self._still is None or self._still.size() != QSize(view.width, view.height):
            self._still = self._draw_still(view)
            self._place_bars(view)
        painter.fillRect(self.rect(), colour(self._theme.ground))
        painter.scale(1 / scale, 1 / scale)
        painter.drawImage(0, 0, self._still)
        over.head(painter, view, self._head_s)
        self._paint_moving(painter, view)

    def _paint_moving(self, painter: QPainter, view: View) -> None:
        """What else moves over the picture, for whoever adds hands to it."""

    def _draw_still(self, view: View) -> QImage:
        assert self._shown is not None and self._source is not None
        if self._frame is None or self._frame.size() != QSize(view.width, view.height):
            self._frame = QImage(view.width, view.height, QImage.Format.Format_RGB32)
            self._frame.fill(colour(self._theme.ground))
            with painting(self._frame) as painter:
                over.around(painter, view, self._shown)
        still = self._frame.copy()
        self._tiles.use(self._source, view.rows, self._theme)
        with painting(still) as painter:
            if view.rows.height:
                painter.drawImage(view.plan.left, view.plan.top, self._threads(view))
            over.over(painter, view, self._shown)
        return still

    def _threads(self, view: View) -> QImage:
        """The threads in view; what is not there yet is stretched from the last whole picture."""
        drawn = QImage(view.plan.width, view.shown, QImage.Format.Format_RGB32)
        drawn.fill(colour(self._theme.ground))
        with painting(drawn) as painter:
            if self._last is not None:
                image, was = self._last
                left, right = (view.x_of(at) - view.plan.left for at in (was.from_s, was.to_s))
                share = view.rows.height / max(was.rows.height, 1)
                painter.drawImage(QRectF(left, was.scroll * share - view.scroll, right - left, image.height() * share), image)
            whole = self._tiles.paint(painter, view, FRAME_BUDGET_MS)
        if whole:
            self._last = (drawn, view)
        return drawn

    def _place_bars(self, view: View) -> None:
        """Scroll bars say where in the whole the window is."""
        whole = self._weave.to_s if self._weave else 1.0
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
            begin = value / STEPS * self._weave.to_s
            self.show_stretch(begin, begin + self._to_s - self._from_s)
        else:
            self.scroll_threads(value - view.scroll)

    def say_time(self, at_s: float) -> str:
        """An instant as people say it: bar and count, and seconds."""
        assert self._weave is not None
        return f"{self._weave.tempo.say_place(at_s)}, {say_seconds(at_s, 2)}"


def differing(tracks: Tracks, other: Tracks) -> np.ndarray:
    """(F,) which fibers move otherwise in `other`."""
    differs = np.ones(tracks.fibers, dtype=bool)
    for fiber in range(tracks.fibers):
        a, b = (slice(one.first[fiber], one.first[fiber + 1]) for one in (tracks, other))
        if a.stop - a.start == b.stop - b.start:
            same = np.allclose(tracks.time_s[a], other.time_s[b], atol=1e-6) and np.allclose(
                tracks.curve[a], other.curve[b], atol=1e-9
            )
            differs[fiber] = not same
    return differs


def _set(bar: QScrollBar, most: int, page: int, value: int) -> None:
    bar.blockSignals(True)
    bar.setRange(0, max(most, 0))
    bar.setPageStep(max(page, 1))
    bar.setSingleStep(max(page // 10, 1))
    bar.setValue(value)
    bar.blockSignals(False)
    bar.setVisible(most > 0)
