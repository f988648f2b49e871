"""The cloth and the list of snags as pages for the rehearsal room's wall: PDF, landscape, a bar never split."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from PySide6.QtCore import QBuffer, QByteArray, QIODevice, QMarginsF, QRectF, Qt
from PySide6.QtGui import QFontMetricsF, QPageLayout, QPageSize, QPainter, QPdfWriter

from composer.picture import png
from composer.picture.cloth import still as cloth
from composer.picture.cloth.heading import columns
from composer.picture.cloth.print_plan import PAGE_S, Named, Sheet, names_on, sheets
from composer.picture.cloth.sampling import AT_ONCE, Sampler
from composer.picture.cloth.weave import Weave
from composer.picture.image import column_times, extends
from composer.picture.look import LEFT, RIGHT, Look, colour, painting, pen
from composer.picture.palette import PAPER
from composer.picture.scene import Scene, Stretch

PAPERS = {"A4": QPageSize.PageSizeId.A4, "Letter": QPageSize.PageSizeId.Letter, "A3": QPageSize.PageSizeId.A3}
DPI = 200
MARGIN_MM = 10.0


@dataclass(frozen=True, slots=True)
class Line:
    """A snag in the list: where, what is wrong, what would mend it."""

    place: str
    says: str
    mends: str


def print_pages(
    weave: Weave,
    title: str,
    snags: Sequence[Line],
    sections: Sequence[Named] = (),
    paper: str = "A4",
    progress: Callable[[float], None] = lambda share: None,
    cancelled: Callable[[], bool] = lambda: False,
) -> bytes | None:
    """The pages of a score as a PDF file; None where `cancelled` said so, which is asked before every page.

    snags: in the order of the list; sections: see `composer.picture.cloth.print_plan.sections_of`
    progress: told the share done, 0 to 1, after every page
    """
    printing = Printing(weave, title, snags, sections, paper)
    for share in printing.pages():
        progress(share)
        if share < 1.0 and cancelled():
            return None
    return printing.pdf


class Printing:
    """Pages under way, for a window that stays alive meanwhile: each step of `pages()` is one page.

    pdf: the file, once `pages()` has come to its end; before that None
    """

    def __init__(
        self, weave: Weave, title: str, snags: Sequence[Line], sections: Sequence[Named] = (), paper: str = "A4"
    ) -> None:
        if paper not in PAPERS:
            raise ValueError(f"no paper '{paper}'; there are {', '.join(PAPERS)}")
        self._weave, self._title, self._snags, self._sections, self._paper = weave, title, snags, sections, paper
        self._sheets = list(sheets(weave.tempo, weave.to_s, weave.bands))
        self._sampler = Sampler(weave.tracks, weave.abilities)
        self._extending = extends(weave.abilities)
        self.pdf: bytes | None = None

    def pages(self) -> Iterator[float]:
        """Print page by page; yields the share done."""
        png.ready()
        held = QByteArray()
        buffer = QBuffer(held)
        buffer.open(QIODevice.OpenModeFlag.WriteOnly)
        writer = QPdfWriter(buffer)
        writer.setResolution(DPI)
        writer.setTitle(self._title)
        writer.setCreator("Drawcord")
        size, margins = QPageSize(PAPERS[self._paper]), QMarginsF(MARGIN_MM, MARGIN_MM, MARGIN_MM, MARGIN_MM)
        writer.setPageLayout(QPageLayout(size, QPageLayout.Orientation.Landscape, margins, QPageLayout.Unit.Millimeter))
        width, height = writer.width(), writer.height()
        look = Look(min(width / 1280, height / 800), PAPER)
        lists = self._lists(look, width, height)
        total = len(self._sheets) + len(lists)
        with painting(writer) as painter:
            for number, sheet in enumerate(self._sheets, 1):
                if number > 1:
                    writer.newPage()
                self._cloth(painter, look, sheet, width, height)
                self._foot(painter, look, number, total, width, height)
                if number < total:
                    yield number / total
            for number, lines in enumerate(lists, len(self._sheets) + 1):
                writer.newPage()
                self._list(painter, look, lines, width, number == len(self._sheets) + 1)
                self._foot(painter, look, number, total, width, height)
                if number < total:
                    yield number / total
        buffer.close()
        self.pdf = bytes(held.data())
        yield 1.0

    # The cloth.

    def _cloth(self, painter: QPainter, look: Look, sheet: Sheet, width: int, height: int) -> None:
        room = height - look.px(26)
        plan = replace(cloth.layout(width, room, len(self._weave.lanes), PAPER), look=look)
        # All pages to one scale, so that they can hang side by side; a bar too long for that has its page for itself.
        share = min((sheet.to_s - sheet.from_s) / PAGE_S, 1.0)
        plan = replace(plan, width=max(round(plan.width * share), 1))
        cloth.paint_in(painter, plan, self._scene(sheet, plan.width), width, room)

    def _scene(self, sheet: Sheet, width: int) -> Scene:
        weave = self._weave
        first, last = (sheet.bands[0].first, sheet.bands[-1].last) if sheet.bands else (0, 0)
        times = column_times(sheet.from_s, sheet.to_s, width)
        step = max(1, AT_ONCE // width)
        runs = [np.arange(at, min(at + step, last)) for at in range(first, last, step)]
        share = np.concatenate([self._sampler.shares(run, times) for run in runs]) if runs else np.zeros((0, width))
        named = ", ".join(names_on(self._sections, sheet.from_s, sheet.to_s))
        bars = (
            f"bar {sheet.from_bar + 1}"
            if sheet.to_bar - sheet.from_bar == 1
            else f"bars {sheet.from_bar + 1} to {sheet.to_bar}"
        )
        told = [bars, *([named] if named else [])]
        if last - first < weave.tracks.fibers:
            told.append(f"threads {first + 1} to {last} of {weave.tracks.fibers}")
        shown = [snag for snag in weave.snags if snag.to_s >= sheet.from_s and snag.from_s <= sheet.to_s]
        return Scene(
            title=self._title,
            subtitle="  ·  ".join(told),
            from_s=sheet.from_s,
            to_s=sheet.to_s,
            share=share,
            extending=self._extending[first:last],
            bands=tuple(replace(band, first=band.first - first, last=band.last - first) for band in sheet.bands),
            names=weave.names[first:last],
            tempo=weave.tempo,
            snags=tuple(
                snag if snag.fiber is None else Stretch(snag.fiber - first, snag.from_s, snag.to_s)
                for snag in shown
                if snag.fiber is None or first <= snag.fiber < last
            ),
            pins_s=weave.pins_s,
            cues=weave.cues,
            lanes=tuple(columns(lane, weave.to_s, sheet.from_s, sheet.to_s, width) for lane in weave.lanes),
        )

    # The list of snags.

    def _lists(self, look: Look, width: int, height: int) -> list[list[Line]]:
        """The list cut into pages, a snag never split; one page that says so where there is none."""
        top, foot = look.px(64), look.px(40)
        pages: list[list[Line]] = [[]]
        left = height - top - foot
        for line in self._snags:
            tall = self._tall(look, line, width)
            if pages[-1] and tall > left:
                pages.append([])
                left = height - top - foot
            pages[-1].append(line)
            left -= tall
        return pages

    def _columns(self, look: Look, width: int) -> tuple[QRectF, QRectF, QRectF]:
        """Place, what is wrong, what would mend it, as columns."""
        place, gap = look.px(96), look.px(16)
        says = (width - place - 2 * look.px(16) - 2 * gap) * 0.56
        left = look.px(16)
        return (
            QRectF(left, 0, place, 0),
            QRectF(left + place + gap, 0, says, 0),
            QRectF(left + place + says + 2 * gap, 0, says * 0.44 / 0.56, 0),
        )

    def _tall(self, look: Look, line: Line, width: int) -> float:
        metrics = QFontMetricsF(look.font(SIZE))
        wrap = int(Qt.TextFlag.TextWordWrap)
        texts = zip(self._columns(look, width), (line.place, line.says, line.mends), strict=True)
        return look.px(10) + max(
            metrics.boundingRect(QRectF(0, 0, box.width(), 1e6), wrap, text).height() for box, text in texts
        )

    def _list(self, painter: QPainter, look: Look, lines: list[Line], width: int, first: bool) -> None:
        used = look.write(painter, QRectF(look.px(16), look.px(10), width * 0.6, look.px(30)), self._title, 21, bold=True)
        count = len(self._weave.snags)
        said = f"{count} snag{'s' * (count != 1)}" if count else "no snags: the rig can do all of it"
        box = QRectF(look.px(32) + used, look.px(13), width - used - look.px(48), look.px(30))
        look.write(painter, box, said if first else f"{said}, continued", 13, PAPER.quiet_ink)
        top = float(look.px(64))
        if lines:
            for box, word in zip(self._columns(look, width), ("where", "what is wrong", "what would mend it"), strict=True):
                head = QRectF(box.left(), top - look.px(20), box.width(), look.px(16))
                look.write(painter, head, word, 11, PAPER.quiet_ink)
        for line in lines:
            tall = self._tall(look, line, width)
            painter.setPen(pen(PAPER.line, look.px(1)))
            painter.drawLine(int(look.px(16)), int(top), int(width - look.px(16)), int(top))
            painter.setFont(look.font(SIZE))
            for box, text in zip(self._columns(look, width), (line.place, line.says, line.mends), strict=True):
                painter.setPen(colour(PAPER.ink))
                room = QRectF(box.left(), top + look.px(5), box.width(), tall)
                painter.drawText(room, int(Qt.TextFlag.TextWordWrap | Qt.AlignmentFlag.AlignTop), text)
            top += tall

    def _foot(self, painter: QPainter, look: Look, number: int, total: int, width: int, height: int) -> None:
        box = QRectF(look.px(16), height - look.px(22), width - look.px(32), look.px(20))
        look.write(painter, box, self._title, 11, PAPER.quiet_ink, LEFT)
        look.write(painter, box, f"page {number} of {total}", 11, PAPER.quiet_ink, RIGHT)


SIZE = 12.5
"""The list's letters, pixels at scale 1."""
