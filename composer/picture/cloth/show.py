"""The living cloth as it is shown: what it holds, and how a frame is drawn."""

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from PySide6.QtCore import QRectF, QSize, Qt, Signal
from PySide6.QtGui import QImage, QPainter, QPaintEvent
from PySide6.QtWidgets import QWidget

from composer.picture.axes import say_seconds
from composer.picture.cloth import over
from composer.picture.cloth.hits import hits_of
from composer.picture.cloth.margins import around
from composer.picture.cloth.over import Shown
from composer.picture.cloth.place import ClothPlace
from composer.picture.cloth.sampling import Source, differing, sampler_of
from composer.picture.cloth.tiling import Tiles
from composer.picture.cloth.view import BAR_PX, View
from composer.picture.cloth.weave import Weave
from composer.picture.image import extends
from composer.picture.look import CENTRE, colour, focus_frame, painting
from composer.picture.palette import DARK, Theme
from composer.picture.scene import Stretch
from composer.tracks import Tracks

FRAME_BUDGET_MS = 12
"""How long a frame may work on threads that are missing before it shows what there is."""
NOTHING = "Nothing to show yet: what is written comes up here as soon as it can be read."


class ClothShow(ClothPlace):
    """A cloth that scrolls and zooms. All instants are seconds of the tracks shown; setters may be called at any time.

    head_moved(seconds): the play head was put somewhere by hand
    settled(): the picture is complete: nothing is still being worked out
    """

    head_moved = Signal(float)
    settled = Signal()

    def __init__(self, parent: QWidget | None = None, theme: Theme = DARK):
        super().__init__(parent, theme)
        self._shown: Shown | None = None
        self._source: Source | None = None
        self._head_s = 0.0
        self._passage: tuple[float, float] | None = None
        self._still: QImage | None = None
        self._frame: QImage | None = None
        self._last: tuple[QImage, View] | None = None
        self._tiles = Tiles(self)
        self._tiles.grown.connect(self._grow)
        self._tiles.settled.connect(self.settled)
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
            self._shown = self._view = None
            for bar in (self._along, self._across):
                bar.hide()
            self.setAccessibleDescription(NOTHING)
            self._redraw()
            return
        hits, marks = hits_of(weave.tracks), over.marks_of(weave.snags)
        known = self._shown or Shown(weave, hits, marks)
        fiber = known.fiber if known.fiber is not None and known.fiber < weave.tracks.fibers else None
        keeps = before is not None and len(before.tracks.time_s) == len(weave.tracks.time_s)
        self._shown = replace(
            known, weave=weave, hits=hits, marks=marks, fiber=fiber, snag=-1, ghost=None,
            hit=known.hit if keeps else -1, lit=known.lit if keeps else known.lit[:0],
        )  # fmt: skip
        count = weave.tracks.fibers
        self.setAccessibleName(f"cloth of {count} fiber{'s' * (count != 1)}")
        if before is None or (self._from_s <= 0.0 and self._to_s >= before.to_s):
            self._from_s, self._to_s = 0.0, self._end_s
            self.stretch_changed.emit(self._from_s, self._to_s)
        else:
            self.show_stretch(self._from_s, self._to_s)
        self._redraw()

    def set_ghost(self, tracks: Tracks | None, words: tuple[str, str] = ("as written", "retimed")) -> None:
        """Show what would be instead, in the lower part of every thread that it changes, with arrows where hits move.

        words: what the threads are, and what the ghost is. `set_weave` takes the ghost away.
        """
        if self._shown is not None:
            fits = tracks is not None and tracks.fibers == self._shown.weave.tracks.fibers
            self._shown = replace(self._shown, ghost=tracks if fits else None, words=words)
            self._redraw()

    def _threads_of(self, shown: Shown) -> Source:
        """What the threads are drawn from: the same as before where nothing of it has changed, so that tiles are kept."""
        tracks, abilities, ghost = shown.weave.tracks, shown.weave.abilities, shown.ghost
        sampler = sampler_of(tracks, abilities)
        other = None if ghost is None else sampler_of(ghost, abilities)
        if self._source is None or self._source.sampler is not sampler or self._source.ghost is not other:
            differs = None if ghost is None else differing(tracks, ghost)
            self._source = Source(sampler, extends(abilities), other, differs)
        return self._source

    def set_theme(self, theme: Theme) -> None:
        """Show it in other colours."""
        self._theme = theme
        self._last = None
        self._style_bars()
        self._redraw()

    def select(self, stretches: Sequence[Stretch]) -> None:
        """Light stretches of threads: those that the caret's line moves, say. None of them is scrolled to; see `reveal`."""
        self._change(selected=over.frames_of(stretches))

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
            # What lies round the threads knows of none of it but the thread that the keys are on.
            frame = self._frame if "fiber" not in changes else None
            self._shown = replace(self._shown, **changes)  # type: ignore[arg-type]
            self._redraw()
            self._frame = frame

    @property
    def fiber(self) -> int | None:
        """The thread that the keys are on."""
        return None if self._shown is None else self._shown.fiber

    def set_passage(self, passage: tuple[float, float] | None) -> None:
        """Show the passage that is gone round in, from an instant to another; None for none."""
        self._passage = passage
        self.update()

    @property
    def head_s(self) -> float:
        """Where the play head stands."""
        return self._head_s

    def set_head(self, at_s: float, follow: bool = False) -> None:
        """Put the play head at an instant, without `head_moved`; `follow` turns the page when it leaves the window."""
        self._update_head()
        self._head_s = min(max(at_s, 0.0), self._weave.to_s if self._weave else 0.0)
        if follow and not self._from_s <= self._head_s <= self._to_s:
            length = self._to_s - self._from_s
            self.show_stretch(self._head_s - 0.05 * length, self._head_s + 0.95 * length)
        self._update_head()

    def _update_head(self) -> None:
        """Draw anew what lies under the head: of a large window a small part."""
        view, scale = self._current(), self.devicePixelRatioF()
        if view is not None:
            half = over.HEAD_PX * view.look.scale + 2.0
            left = math.floor((view.x_of(self._head_s) - half) / scale)
            self.update(left, 0, math.ceil(2.0 * half / scale) + 1, self.height())

    @property
    def complete(self) -> bool:
        """Whether nothing of the picture is still being worked out."""
        return not self._tiles.busy

    # A frame.

    def _redraw(self) -> None:
        self._still = self._frame = None
        super()._redraw()

    def _grow(self) -> None:
        """There are more threads to show; what lies round them stays."""
        self._still = None
        self.update()

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
        # Only beside and below the picture, where the scroll bars are, is there ground to be seen.
        for bar in (self._along, self._across):
            painter.fillRect(bar.geometry().adjusted(-1, -1, BAR_PX, BAR_PX), colour(self._theme.ground))
        painter.scale(1 / scale, 1 / scale)
        painter.drawImage(0, 0, self._still)
        if self._passage is not None:
            over.passage(painter, view, *self._passage)
        over.head(painter, view, self._head_s)
        self._paint_moving(painter, view)
        if self.hasFocus():
            focus_frame(painter, view.look, self.width() * scale, self.height() * scale)

    def _paint_moving(self, painter: QPainter, view: View) -> None:
        """What else moves over the picture, for whoever adds hands to it."""

    def _draw_still(self, view: View) -> QImage:
        assert self._shown is not None
        if self._frame is None or self._frame.size() != QSize(view.width, view.height):
            self._frame = QImage(view.width, view.height, QImage.Format.Format_RGB32)
            self._frame.fill(colour(self._theme.ground))
            with painting(self._frame) as painter:
                around(painter, view, self._shown)
        still = self._frame.copy()
        self._tiles.use(self._threads_of(self._shown), view.rows, self._theme)
        with painting(still) as painter:
            if view.rows.height:
                painter.drawImage(view.plan.left, view.plan.top, self._threads(view))
            over.over(painter, view, self._shown)
        return still

    def _threads(self, view: View) -> QImage:
        """The threads in view; what is not there yet is stretched from the last whole picture."""
        drawn = QImage(view.plan.width, view.shown, QImage.Format.Format_RGB32)
        with painting(drawn) as painter:

            def beneath() -> None:
                painter.fillRect(drawn.rect(), colour(self._theme.ground))
                if self._last is not None:
                    image, was = self._last
                    left, right = (view.x_of(at) - view.plan.left for at in (was.from_s, was.to_s))
                    share = view.rows.height / max(was.rows.height, 1)
                    there = QRectF(left, was.scroll * share - view.scroll, right - left, image.height() * share)
                    painter.drawImage(there, image)

            whole = self._tiles.paint(painter, view, FRAME_BUDGET_MS, beneath)
        if whole:
            self._last = (drawn, view)
        return drawn

    def say_time(self, at_s: float) -> str:
        """An instant as people say it: bar and count, and seconds."""
        assert self._weave is not None
        return f"{self._weave.tempo.say_place(at_s)}, {say_seconds(at_s, 2)}"
