"""How the controls of a window look in a theme: buttons, labels, sliders; sizes in pixels that grow with the window."""

from composer.picture.look import FAMILIES
from composer.picture.palette import Colour, Theme


def scale_of(width: int, height: int) -> float:
    """The scale of controls in a window of that size, in quarters: 1 at 1280 by 800, up to 3."""
    return min(max(round(4.0 * min(width / 1280.0, height / 800.0)) / 4.0, 1.0), 3.0)


def style_of(theme: Theme, scale: float = 1.0) -> str:
    """The style sheet of a window."""

    def of(colour: Colour) -> str:
        return f"rgb({colour[0]}, {colour[1]}, {colour[2]})"

    def px(size: float) -> str:
        return f"{max(1, round(size * scale))}px"

    families = ", ".join(f'"{family}"' for family in FAMILIES)
    return f"""
QWidget {{ background: {of(theme.ground)}; color: {of(theme.ink)}; font-family: {families}; font-size: {px(12.5)}; }}
QLabel#title {{ font-size: {px(17)}; font-weight: bold; }}
QLabel#keys, QLabel#quiet {{ color: {of(theme.quiet_ink)}; font-size: {px(11)}; }}
QPushButton, QComboBox {{ background: {of(theme.raised)}; border: {px(1)} solid {of(theme.edge)}; border-radius: {px(4)};
  padding: {px(3)} {px(9)}; }}
QPushButton:hover, QComboBox:hover {{ border-color: {of(theme.ink)}; }}
QPushButton:focus, QComboBox:focus, QSlider:focus {{ border: {px(2)} solid {of(theme.chosen)}; }}
QPushButton:checked {{ background: {of(theme.ink)}; color: {of(theme.ground)}; }}
QPushButton:disabled {{ color: {of(theme.quiet_ink)}; border-color: {of(theme.faint_line)}; background: {of(theme.ground)}; }}
QComboBox QAbstractItemView {{ background: {of(theme.raised)}; color: {of(theme.ink)}; }}
QSlider {{ border: {px(2)} solid transparent; min-height: {px(18)}; }}
QSlider#volume {{ min-width: {px(64)}; max-width: {px(64)}; }}
QSlider::groove:horizontal {{ height: {px(4)}; background: {of(theme.line)}; border-radius: {px(2)}; }}
QSlider::sub-page:horizontal {{ height: {px(4)}; background: {of(theme.quiet_ink)}; border-radius: {px(2)}; }}
QSlider::handle:horizontal {{ width: {px(10)}; margin: -{px(5)} 0; background: {of(theme.head)}; border-radius: {px(5)}; }}
QSlider::handle:horizontal:disabled {{ background: {of(theme.line)}; }}
QProgressBar {{ background: {of(theme.panel)}; border: {px(1)} solid {of(theme.edge)}; border-radius: {px(3)}; }}
QProgressBar::chunk {{ background: {of(theme.supply)}; border-radius: {px(3)}; }}
QSplitter::handle {{ background: {of(theme.line)}; height: {px(3)}; }}
QListWidget {{ background: {of(theme.panel)}; border: {px(1)} solid {of(theme.line)}; }}
QListWidget::item:selected {{ background: {of(theme.ink)}; color: {of(theme.ground)}; }}
QToolTip {{ background: {of(theme.raised)}; color: {of(theme.ink)}; border: {px(1)} solid {of(theme.edge)}; }}
"""
