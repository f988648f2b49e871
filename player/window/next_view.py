"""What comes next, large: the cue, its place, and the count-in."""

from dataclasses import dataclass

from PySide6.QtCore import QRectF, Qt
from PySide6.QtGui import QFontMetricsF, QPainter, QPaintEvent
from PySide6.QtWidgets import QSizePolicy, QWidget

from composer.picture.chrome import scale_of
from composer.picture.look import LEFT, RIGHT, Look, colour, painting
from composer.picture.palette import DARK, Theme
from player.window.count_in import CountIn

NEAR = 8
"""Counts from which on the figure is lit."""


@dataclass(frozen=True, slots=True)
class Coming:
    """The cue that comes: name, place as bar and count, whether the score waits there; its count-in, None where none comes.

    says: instead of a figure, where there is none
    """

    cue: str = ""
    place: str = ""
    waits: bool = False
    left: CountIn | None = None
    says: str = ""


def as_shown(coming: Coming) -> tuple:
    """What of it can be seen: seconds to a tenth, so that it is not written anew with every frame."""
    left = coming.left
    seen = None if left is None else (left.figure, left.unit, left.beat, left.of, f"{left.seconds:.1f}")
    return coming.cue, coming.place, coming.waits, coming.says, seen


class NextView(QWidget):
    """Shows a `Coming`."""

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._coming = Coming()
        self._theme: Theme = DARK
        self.setAccessibleName("what comes next")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)

    def set_theme(self, theme: Theme, scale: float) -> None:
        """Draw in these colours, at this scale."""
        self._theme = theme
        self.setFixedHeight(round(186 * scale))
        self.update()

    def show_coming(self, coming: Coming) -> None:
        """What comes now."""
        if as_shown(coming) != as_shown(self._coming):
            said = said_of(coming)
            if said != self.accessibleDescription():
                self.setAccessibleDescription(said)
            self._coming = coming
            self.update()

    def paintEvent(self, event: QPaintEvent) -> None:
        """Cue and place on the left, the figure on the right, the bar's counts as a row of marks below."""
        coming, theme = self._coming, self._theme
        look = Look(scale_of(self.window().width(), self.window().height()), theme)
        with painting(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.fillRect(self.rect(), colour(theme.panel))
            width, pad = self.width(), look.px(14)
            left = coming.left
            figure_wide = look.px(190) if left is not None else 0
            look.write(painter, QRectF(pad, look.px(8), width, look.px(18)), "next", 14, theme.quiet_ink, LEFT)
            room = width - figure_wide - 2 * pad
            cue = coming.cue or coming.says or "nothing more"
            _fitted(painter, look, QRectF(pad, look.px(26), room, look.px(58)), cue, 44, theme.cue if coming.cue else theme.ink)
            place = f"at {coming.place}" if coming.place else ""
            if coming.waits:
                place += ", and waits there"
            _fitted(painter, look, QRectF(pad, look.px(86), room, look.px(34)), place, 26, theme.ink)
            if left is not None:
                near = left.unit != "bars" and left.figure <= NEAR
                box = QRectF(width - figure_wide - pad, look.px(4), figure_wide, look.px(116))
                size = 120 if left.figure < 100 else 84
                painter.setFont(look.font(size, True))
                painter.setPen(colour(theme.caution if near else theme.ink))
                painter.drawText(box, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, str(left.figure))
                unit = left.unit if left.figure != 1 else left.unit[:-1]
                below = QRectF(width - figure_wide - pad, look.px(116), figure_wide, look.px(24))
                look.write(painter, below, f"{unit}, {left.seconds:.1f} s", 17, theme.ink, RIGHT)
                self._beats(painter, look, left, QRectF(pad, look.px(146), width - 2 * pad, look.px(28)))

    def _beats(self, painter: QPainter, look: Look, left: CountIn, box: QRectF) -> None:
        if not left.of or left.of > 32:
            return
        step = min(box.width() / left.of, look.px(96))
        for number in range(1, left.of + 1):
            now = number == left.beat
            cell = QRectF(box.left() + (number - 1) * step, box.top(), step - look.px(6), box.height())
            painter.setPen(Qt.PenStyle.NoPen)
            painter.setBrush(colour(look.theme.ink if now else look.theme.raised))
            painter.drawRoundedRect(cell, look.px(3), look.px(3))
            painter.setFont(look.font(18, now))
            painter.setPen(colour(look.theme.ground if now else look.theme.quiet_ink))
            painter.drawText(cell, Qt.AlignmentFlag.AlignCenter, str(number))


def said_of(coming: Coming) -> str:
    """The same as a sentence, for those who hear it; it changes with bars and the last counts alone."""
    if not coming.cue:
        return coming.says or "nothing more comes"
    waits = ", and waits there" if coming.waits else ""
    left = coming.left
    return f"{coming.cue} at {coming.place}{waits}" + (f", in {left.figure} {left.unit}" if left is not None else "")


def _fitted(painter: QPainter, look: Look, box: QRectF, text: str, size: float, of: tuple[int, int, int]) -> None:
    """A text as large as there is room for, down to a half; then it is cut."""
    for share in (1.0, 0.8, 0.65, 0.5):
        font = look.font(size * share, True)
        metrics = QFontMetricsF(font)
        if metrics.horizontalAdvance(text) <= box.width():
            break
    painter.setFont(font)
    painter.setPen(colour(of))
    text = metrics.elidedText(text, Qt.TextElideMode.ElideRight, box.width())
    painter.drawText(box, Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter, text)
