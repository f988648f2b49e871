"""The threads' image as tiles, kept from one frame to the next and worked out in slices between frames."""

from collections import OrderedDict
from collections.abc import Callable, Iterator

import numpy as np
from PySide6.QtCore import QElapsedTimer, QObject, QRect, QTimer, Signal
from PySide6.QtGui import QImage, QPainter

from composer.picture.cloth.sampling import Source, rendered
from composer.picture.cloth.view import View, level_of
from composer.picture.image import Image, Rows
from composer.picture.palette import Theme

COLUMNS, ROWS = 256, 256
"""The size of a tile, pixels."""
MOST_BYTES = 160 << 20
"""What tiles may take in all; those not looked at for longest go first."""
SLICE_MS = 8
SHOW_EVERY_MS = 80
"""How long after one frame a picture that grows is shown again: on a large window a frame itself takes a while."""

Key = tuple[int, int, int]


class Tiles(QObject):
    """Tiles of one cloth. `grown` says that there is more to show, `settled` that nothing is missing any more."""

    grown = Signal()
    settled = Signal()

    def __init__(self, parent: QObject | None = None):
        super().__init__(parent)
        self._source: Source | None = None
        self._rows: Rows | None = None
        self._theme: Theme | None = None
        self._done: OrderedDict[Key, tuple[QImage, bool]] = OrderedDict()
        self._bytes = 0
        self._wanted: list[tuple[bool, Key]] = []
        self._job: tuple[bool, Key, Iterator[Image]] | None = None
        self._timer = QTimer(self)
        self._timer.setInterval(1)
        self._timer.timeout.connect(self._slice)
        self._since = QElapsedTimer()
        self._since.start()

    @property
    def held_bytes(self) -> int:
        """What the tiles take."""
        return self._bytes

    @property
    def busy(self) -> bool:
        """Whether tiles are being worked out."""
        return bool(self._wanted or self._job)

    def use(self, source: Source, rows: Rows, theme: Theme) -> None:
        """Say what the tiles are of; all are dropped where that is another."""
        if source is not self._source or rows is not self._rows or theme is not self._theme:
            self._source, self._rows, self._theme = source, rows, theme
            self._done.clear()
            self._bytes = 0
            self._wanted, self._job = [], None

    def paint(self, painter: QPainter, view: View, budget_ms: int, beneath: Callable[[], None] = lambda: None) -> bool:
        """Draw what there is of a view, its left top at 0, 0, working on what is missing for `budget_ms` first.

        Returns whether nothing was missing; what was is worked out later, and `grown` says so. `beneath` is called before
        anything is drawn where something is missing, to draw what shows in its place.
        """
        keys = self._keys(view)
        self._want(keys)
        self._work(budget_ms)
        missing = any(key not in self._done or not self._done[key][1] for key in keys)
        if missing:
            beneath()
        for key in keys:
            there = self._done.get(key)
            if there is not None:
                self._done.move_to_end(key)
                self._draw(painter, view, key, there[0])
        if missing:
            self._timer.start()
        self._since.restart()
        return not missing

    def _keys(self, view: View) -> list[Key]:
        level = level_of(view.per_px)
        lasts = COLUMNS * 2.0**level
        columns = range(int(np.floor(view.from_s / lasts)), int(np.floor(view.to_s / lasts)) + 1)
        pages = range(view.scroll // ROWS, (view.scroll + max(view.shown, 1) - 1) // ROWS + 1)
        return [(level, column, page) for column in columns for page in pages]

    def _want(self, keys: list[Key]) -> None:
        crowded = self._rows is not None and self._rows.crowded
        here = [(False, key) for key in keys if key not in self._done or not self._done[key][1]]
        first = [(True, key) for key in keys if key not in self._done] if crowded else []
        self._wanted = first + here
        if self._job is not None:
            if self._job[:2] in self._wanted:
                self._wanted.remove(self._job[:2])
            else:
                self._job = None

    def _work(self, budget_ms: int) -> None:
        """Go on with what is wanted until it is done or the time is up."""
        clock = QElapsedTimer()
        clock.start()
        while clock.elapsed() < budget_ms:
            if self._job is None:
                if not self._wanted:
                    return
                coarse, key = self._wanted.pop(0)
                self._job = (coarse, key, self._render(coarse, key))
            coarse, key, steps = self._job
            drawn = next(steps, None)
            if drawn is None:
                self._job = None
                self._keep(key, self._drawn, not coarse)
            else:
                self._drawn = drawn

    def _render(self, coarse: bool, key: Key) -> Iterator[Image]:
        level, column, page = key
        assert self._source is not None and self._rows is not None and self._theme is not None
        times = (column * COLUMNS + np.arange(COLUMNS) + 0.5) * 2.0**level
        height = max(1, min(ROWS, self._rows.height - page * ROWS))
        self._drawn = np.empty((height, COLUMNS, 3), dtype=np.uint8)
        self._drawn[:] = self._theme.ground
        return rendered(self._source, self._rows, page * ROWS, height, times, self._theme, coarse)

    def _keep(self, key: Key, drawn: Image, whole: bool) -> None:
        if key in self._done:
            self._bytes -= self._done.pop(key)[0].sizeInBytes()
        made = as_screen(drawn)
        self._done[key] = (made, whole)
        self._bytes += made.sizeInBytes()
        while self._bytes > MOST_BYTES and len(self._done) > 1:
            _, (gone, _) = self._done.popitem(last=False)
            self._bytes -= gone.sizeInBytes()

    def _draw(self, painter: QPainter, view: View, key: Key, tile: QImage) -> None:
        level, column, page = key
        lasts = COLUMNS * 2.0**level
        left = round(view.x_of(column * lasts)) - view.plan.left
        right = round(view.x_of((column + 1) * lasts)) - view.plan.left
        painter.drawImage(QRect(left, page * ROWS - view.scroll, max(right - left, 1), tile.height()), tile)

    def _slice(self) -> None:
        self._work(SLICE_MS)
        done = not self.busy
        if done:
            self._timer.stop()
        if done or self._since.elapsed() >= SHOW_EVERY_MS:
            self._since.restart()
            self.grown.emit()
        if done:
            self.settled.emit()


def as_screen(drawn: Image) -> QImage:
    """An image (height, width, 3) as the screen has it, with memory of its own."""
    high, wide, _ = drawn.shape
    held = np.full((high, wide, 4), 255, dtype=np.uint8)
    held[:, :, :3] = drawn[:, :, ::-1]
    return QImage(held.data, wide, high, 4 * wide, QImage.Format.Format_RGB32).copy()
