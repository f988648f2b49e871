"""How the rehearse window looks: the controls of all windows, larger, for whoever stands three metres away in the dark."""

from composer.picture.chrome import style_of
from composer.picture.palette import Colour, Theme

VENT_BACK: Colour = (186, 28, 20)
VENT_INK: Colour = (255, 255, 255)
"""VENT looks the same in every light."""


def sheet_of(theme: Theme, scale: float) -> str:
    """The style sheet of the window."""

    def of(colour: Colour) -> str:
        return f"rgb({colour[0]}, {colour[1]}, {colour[2]})"

    def px(size: float) -> str:
        return f"{max(1, round(size * scale))}px"

    return (
        style_of(theme, scale)
        + f"""
QLabel#state {{ font-size: {px(50)}; font-weight: bold; }}
QLabel#more {{ font-size: {px(16)}; color: {of(theme.quiet_ink)}; }}
QLabel#place {{ font-size: {px(50)}; }}
QLabel#title {{ font-size: {px(18)}; font-weight: bold; }}
QLabel#name {{ font-size: {px(15)}; color: {of(theme.quiet_ink)}; background: {of(theme.panel)}; }}
QLabel#value {{ font-size: {px(15)}; background: {of(theme.panel)}; }}
QLabel#value[bad="true"] {{ color: {of(theme.fault)}; font-weight: bold; }}
QLabel#why {{ font-size: {px(14)}; color: {of(theme.caution)}; }}
QLabel#status {{ font-size: {px(13)}; color: {of(theme.quiet_ink)}; }}
QLabel#banner {{ font-size: {px(20)}; font-weight: bold; color: {of(theme.ground)}; background: {of(theme.fault)};
  padding: {px(8)} {px(14)}; }}
QLabel#banner[calm="true"] {{ color: {of(theme.ink)}; background: {of(theme.raised)}; }}
QLabel#banner[pale="true"] {{ color: {of(theme.fault)}; background: {of(theme.ground)}; }}
QPushButton#vent {{ font-size: {px(34)}; font-weight: bold; color: {of(VENT_INK)}; background: {of(VENT_BACK)};
  border: {px(3)} solid {of(VENT_INK)}; border-radius: {px(8)}; padding: {px(6)} {px(18)}; }}
QPushButton#deed {{ font-size: {px(19)}; padding: {px(7)} {px(14)}; }}
QPushButton#tab {{ font-size: {px(14)}; }}
QComboBox#from {{ font-size: {px(15)}; padding: {px(7)} {px(8)}; }}
QListWidget#log {{ font-size: {px(15)}; }}
QListWidget {{ font-size: {px(16)}; }}
QWidget#instruments {{ background: {of(theme.panel)}; }}
QScrollBar:vertical {{ background: {of(theme.panel)}; width: {px(12)}; }}
QScrollBar::handle:vertical {{ background: {of(theme.edge)}; border-radius: {px(4)}; min-height: {px(24)}; }}
QScrollBar::add-line:vertical, QScrollBar::sub-line:vertical {{ height: 0; }}
QTableWidget {{ background: {of(theme.panel)}; font-size: {px(15)}; gridline-color: {of(theme.line)}; }}
QHeaderView::section {{ background: {of(theme.raised)}; color: {of(theme.ink)}; border: 0; padding: {px(4)}; }}
QLineEdit, QDoubleSpinBox {{ background: {of(theme.field)}; border: {px(1)} solid {of(theme.edge)}; padding: {px(4)}; }}
QLineEdit:focus, QDoubleSpinBox:focus {{ border: {px(2)} solid {of(theme.chosen)}; }}
"""
    )
