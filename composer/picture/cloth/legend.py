"""The legend: what the brightness, the hatch, pins and cues mean, and no more than what the picture has."""

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QPainter, QPolygonF

from composer.picture import palette
from composer.picture.image import Image
from composer.picture.look import Look, colour, pen
from composer.picture.scene import Scene


def paint(painter: QPainter, look: Look, scene: Scene, box: QRectF) -> None:
    """Draw the legend of a scene into a box of one line."""
    x = box.left()
    for word, ramp, shown in (
        ("contracts", look.theme.contract, not scene.extending.all()),
        ("extends", look.theme.extend, scene.extending.any()),
    ):
        if shown:
            x = _ramp(painter, look, box, x, word, ramp)
    line = QRectF(x, box.top(), box.right() - x, box.height())
    if scene.snags:
        count = len(scene.snags)
        word = f"{count} snag{'s' * (count != 1)}: more than the rig can do"
        swatch = QRectF(line.left(), box.center().y() - look.px(7), look.px(30), look.px(14))
        painter.fillRect(swatch, colour(look.theme.panel))
        painter.fillRect(swatch, look.hatch())
        line.setLeft(_word(painter, look, line, look.px(36), word))
    if scene.pins_s:
        at = line.left() + look.px(4)
        painter.setPen(pen(look.theme.pin, max(1.0, 1.2 * look.scale)))
        painter.drawLine(QPointF(at, box.center().y() - look.px(4)), QPointF(at, box.center().y() + look.px(8)))
        painter.setBrush(colour(look.theme.pin))
        painter.drawEllipse(QPointF(at, box.center().y() - look.px(5)), look.px(3.5), look.px(3.5))
        line.setLeft(_word(painter, look, line, look.px(13), "pin: must not move"))
    if scene.cues:
        y = box.center().y() - look.px(6)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(colour(look.theme.cue))
        left = line.left()
        painter.drawPolygon(
            QPolygonF([QPointF(left, y), QPointF(left + look.px(9), y + look.px(6)), QPointF(left, y + look.px(12))])
        )
        _word(painter, look, line, look.px(14), "cue")


def _word(painter: QPainter, look: Look, line: QRectF, skip: float, word: str) -> float:
    """Write a word behind its sign; returns where the next sign begins."""
    room = QRectF(line.left() + skip, line.top(), max(line.width() - skip, 0.0), line.height())
    return room.left() + look.write(painter, room, word, 11.5, look.theme.ink) + look.px(22)


def _ramp(painter: QPainter, look: Look, box: QRectF, x: float, word: str, ramp: Image) -> float:
    """A ramp of one hue from rest to full stroke; returns where the next sign begins."""
    line = QRectF(x, box.top(), box.right() - x, box.height())
    used = look.write(painter, line, f"{word}:  rest", 11.5)
    left, wide, high = x + used + look.px(6), look.px(96), look.px(14)
    step = wide / 48
    for number in range(48):
        shade = tuple(int(part) for part in ramp[round(number / 47 * (palette.STEPS - 1))])
        painter.fillRect(QRectF(left + number * step, box.center().y() - high / 2, step + 1, high), colour(shade))
    after = QRectF(left + wide + look.px(6), box.top(), look.px(90), box.height())
    return after.left() + look.write(painter, after, "full", 11.5) + look.px(26)
