"""A theme on the window's own parts: buttons, lists, menus, bars."""

from PySide6.QtGui import QColor, QPalette
from PySide6.QtWidgets import QApplication

from composer.picture.look import FAMILIES
from composer.picture.palette import Colour, Theme


def _web(of: Colour) -> str:
    return "#{:02x}{:02x}{:02x}".format(*of)


def _mixed(one: Colour, other: Colour, share: float) -> Colour:
    return tuple(round(a + (b - a) * share) for a, b in zip(one, other, strict=True))  # type: ignore[return-value]


def palette_of(theme: Theme) -> QPalette:
    """The theme as Qt's own palette."""
    made = QPalette()
    role = QPalette.ColorRole
    for which, of in (
        (role.Window, theme.panel),
        (role.WindowText, theme.ink),
        (role.Base, theme.field),
        (role.AlternateBase, theme.panel),
        (role.Text, theme.ink),
        (role.PlaceholderText, theme.quiet_ink),
        (role.Button, theme.raised),
        (role.ButtonText, theme.ink),
        (role.BrightText, theme.fault),
        (role.ToolTipBase, theme.raised),
        (role.ToolTipText, theme.ink),
        (role.Highlight, _mixed(theme.field, theme.chosen, 0.35)),
        (role.HighlightedText, theme.ink),
        (role.Link, theme.chosen),
        (role.Light, theme.line),
        (role.Midlight, theme.line),
        (role.Mid, theme.edge),
        (role.Dark, theme.faint_line),
        (role.Shadow, theme.ground),
    ):
        made.setColor(which, QColor(*of))
    for which in (role.WindowText, role.Text, role.ButtonText):
        made.setColor(QPalette.ColorGroup.Disabled, which, QColor(*_mixed(theme.quiet_ink, theme.panel, 0.35)))
    return made


FACES = ", ".join(f'"{family}"' for family in FAMILIES)
TEXT_FACES = '"DejaVu Sans Mono", "Noto Sans Mono", "Consolas", "Menlo", monospace'

LETTERS_PX, TEXT_PX = 12.5, 13.0
"""Height of letters at scale 1: of the window's words, and of the score's text."""

SMALLEST, LARGEST = 0.75, 4.0


def scale_for(width: int, height: int) -> float:
    """How large letters are in a window of that many pixels, in quarters: 1 at 1280 by 800, not quite 2 at 3840 by 2160.

    A larger window shows more, and that from further away.
    """
    grown = max(1.0, min(width / 1280.0, height / 800.0))
    return round(4.0 * (1.0 + 0.5 * (grown - 1.0))) / 4.0


def sheet_of(theme: Theme, scale: float = 1.0, text_scale: float = 1.0) -> str:
    """What the palette does not say, as a style sheet; `text_scale` is of the score's text, beside that of all letters."""

    def px(size: float) -> str:
        return f"{max(1, round(size * scale))}px"

    text = f"{max(6, round(TEXT_PX * scale * text_scale))}px"
    ink, quiet, panel, raised = (_web(getattr(theme, name)) for name in ("ink", "quiet_ink", "panel", "raised"))
    field, edge, chosen, line = (_web(getattr(theme, name)) for name in ("field", "edge", "chosen", "line"))
    fault, caution, ground = (_web(getattr(theme, name)) for name in ("fault", "caution", "ground"))
    lit = _web(_mixed(theme.field, theme.chosen, 0.30))
    return f"""
        QWidget {{ color: {ink}; font-family: {FACES}; font-size: {px(LETTERS_PX)}; }}
        QPlainTextEdit#score, QListWidget#offers, QPlainTextEdit#fixed {{ font-family: {TEXT_FACES}; font-size: {text}; }}
        QMainWindow, QMenuBar, QStatusBar, QDialog {{ background: {panel}; }}
        QMenuBar::item {{ padding: {px(4)} {px(9)}; background: transparent; }}
        QMenuBar::item:selected, QMenu::item:selected {{ background: {lit}; }}
        QMenu {{ background: {raised}; border: 1px solid {edge}; padding: {px(4)} 0; }}
        QMenu::item {{ padding: {px(4)} {px(28)} {px(4)} {px(24)}; }}
        QMenu::separator {{ height: 1px; background: {line}; margin: {px(4)} {px(8)}; }}
        QMenu::item:disabled, QPushButton:disabled {{ color: {_web(_mixed(theme.quiet_ink, theme.panel, 0.35))}; }}
        QPushButton, QComboBox {{ background: {raised}; border: 1px solid {edge}; border-radius: {px(3)};
            padding: {px(3)} {px(9)}; }}
        QPushButton:hover, QComboBox:hover {{ border-color: {ink}; }}
        QPushButton:focus, QComboBox:focus, QLineEdit:focus {{ border: {px(2)} solid {chosen}; padding: {px(2)} {px(8)}; }}
        QPushButton:pressed, QPushButton:checked {{ background: {lit}; }}
        QPushButton#mend {{ text-align: left; }}
        QLineEdit {{ background: {field}; border: 1px solid {edge}; border-radius: {px(3)}; padding: {px(3)} {px(6)}; }}
        QPlainTextEdit, QListWidget, QScrollArea, QScrollArea > QWidget > QWidget, QTableWidget, QTextBrowser {{
            background: {field}; border: none; }}
        QPlainTextEdit {{ selection-background-color: {lit}; selection-color: {ink}; border-top: {px(2)} solid {field}; }}
        QPlainTextEdit:focus {{ border-top: {px(2)} solid {chosen}; }}
        QListWidget::item {{ padding: {px(3)} {px(6)}; }}
        QListWidget::item:selected {{ background: {lit}; color: {ink}; border-left: {px(3)} solid {chosen}; }}
        QListWidget:focus {{ border-top: {px(2)} solid {chosen}; }}
        QTabWidget::pane {{ border: none; }}
        QTabBar::tab {{ background: {panel}; color: {quiet}; padding: {px(4)} {px(12)};
            border-bottom: {px(2)} solid transparent; }}
        QTabBar::tab:selected {{ color: {ink}; border-bottom: {px(2)} solid {chosen}; }}
        QTabBar::tab:focus {{ color: {chosen}; }}
        QSplitter::handle {{ background: {line}; }}
        QSplitter::handle:hover {{ background: {chosen}; }}
        QFrame#notice {{ background: {raised}; border-left: {px(4)} solid {caution}; }}
        QFrame#fault {{ background: {raised}; border-left: {px(4)} solid {fault}; }}
        QFrame#help {{ background: {raised}; border-left: {px(4)} solid {chosen}; }}
        QFrame#sheet {{ background: {panel}; border: {px(2)} solid {edge}; }}
        QLabel#title {{ font-weight: bold; font-size: {px(15)}; }}
        QLabel#quiet {{ color: {quiet}; }}
        QToolTip {{ background: {raised}; color: {ink}; border: 1px solid {edge}; padding: {px(3)}; }}
        QStatusBar::item {{ border: none; }}
        QScrollBar {{ background: {panel}; border: none; }}
        QScrollBar:vertical {{ width: {px(12)}; }}
        QScrollBar:horizontal {{ height: {px(12)}; }}
        QScrollBar::handle {{ background: {edge}; border: {px(3)} solid {panel}; border-radius: {px(5)}; min-height: {px(24)};
            min-width: {px(24)}; }}
        QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
        QScrollBar::add-page, QScrollBar::sub-page {{ background: {ground}; }}
        QComboBox QAbstractItemView {{ background: {raised}; border: 1px solid {edge}; selection-background-color: {lit}; }}
        QHeaderView::section {{ background: {panel}; color: {quiet}; border: none; padding: {px(3)} {px(6)}; }}
        QCheckBox::indicator {{ width: {px(13)}; height: {px(13)}; border: 1px solid {edge}; background: {field}; }}
        QCheckBox::indicator:checked {{ background: {chosen}; }}
        QProgressBar {{ background: {field}; border: 1px solid {edge}; text-align: center; }}
        QProgressBar::chunk {{ background: {lit}; }}
    """


def dress(application: QApplication, theme: Theme, scale: float = 1.0, text_scale: float = 1.0) -> None:
    """Have the whole application in a theme."""
    if application.style().objectName() != "fusion":
        application.setStyle("Fusion")
    application.setPalette(palette_of(theme))
    application.setStyleSheet(sheet_of(theme, scale, text_scale))
