"""How the classes of a text's words look: a colour of the theme each, and weight or slant beside it, so that no class hangs on
its colour alone."""

from dataclasses import dataclass

from PySide6.QtGui import QColor, QFont, QTextCharFormat

from composer.picture.palette import Theme


@dataclass(frozen=True, slots=True)
class Style:
    """A colour by its name in the theme, and how the letters stand."""

    colour: str
    bold: bool = False
    italic: bool = False
    waved: bool = False


STYLES: dict[str, Style] = {
    "statement": Style("supply", bold=True),
    "option": Style("supply"),
    "shape": Style("duty"),
    "manner": Style("duty"),
    "target": Style("cue"),
    "word": Style("quiet_ink"),
    "number": Style("ink"),
    "place": Style("ink", bold=True),
    "unit": Style("quiet_ink"),
    "name": Style("miss", bold=True),
    "phrase": Style("miss"),
    "fiber": Style("cue"),
    "text": Style("caution"),
    "path": Style("caution"),
    "mark": Style("quiet_ink"),
    "comment": Style("quiet_ink", italic=True),
    "wrong": Style("fault", waved=True),
}
"""By class, as `composer.edits.colouring.CLASSES` has them."""


def formats(theme: Theme) -> dict[str, QTextCharFormat]:
    """The formats of all classes in a theme."""
    made = {}
    for name, style in STYLES.items():
        form = QTextCharFormat()
        form.setForeground(QColor(*getattr(theme, style.colour)))
        if style.bold:
            form.setFontWeight(QFont.Weight.Bold)
        form.setFontItalic(style.italic)
        if style.waved:
            form.setUnderlineStyle(QTextCharFormat.UnderlineStyle.WaveUnderline)
            form.setUnderlineColor(QColor(*theme.fault))
        made[name] = form
    return made
