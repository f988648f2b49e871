"""A picture into a file's bytes, with or without a screen."""

import os
from collections.abc import Callable

from PySide6.QtCore import QBuffer, QByteArray, QIODevice
from PySide6.QtGui import QFontDatabase, QImage, QPainter
from PySide6.QtWidgets import QApplication

_application: QApplication | None = None


def ready() -> None:
    """Have Qt ready to draw text: without a screen unless a window's application runs already."""
    global _application
    if QApplication.instance() is None:
        # A file needs no screen, and one that is named but cannot be reached would end the program.
        os.environ["QT_QPA_PLATFORM"] = "offscreen"
        # One that could show windows too, as a process can only have one.
        _application = QApplication(["drawcord"])


def has_letters() -> bool:
    """Whether the machine has any font: without one pictures come out without words."""
    ready()
    return bool(QFontDatabase.families())


def drawn(paint: Callable[[QPainter], None], width: int, height: int) -> QImage:
    """The picture of that size that `paint` draws."""
    ready()
    picture = QImage(width, height, QImage.Format.Format_RGB32)
    painter = QPainter(picture)
    try:
        paint(painter)
    finally:
        painter.end()
    return picture


def png_bytes(picture: QImage) -> bytes:
    """The picture as a PNG file (ISO/IEC 15948)."""
    held = QByteArray()
    buffer = QBuffer(held)
    buffer.open(QIODevice.OpenModeFlag.WriteOnly)
    if not picture.save(buffer, "PNG"):
        raise RuntimeError("Qt cannot write PNG files here")
    buffer.close()
    return bytes(held.data())
