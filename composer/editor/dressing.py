"""A theme on the window's own parts: buttons, lists, menus, bars."""

from PySide6.QtGui import QColor, QPalette
from PySide6.QtWidgets import QApplication

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


def sheet_of(theme: Theme) -> str:
    """What the palette does not say, as a style sheet."""
    ink, quiet, panel, raised = (_web(getattr(theme, name)) for name in ("ink", "quiet_ink", "panel", "raised"))
    field, edge, chosen, line = (_web(getattr(theme, name)) for name in ("field", "edge", "chosen", "line"))
    fault, caution, ground = (_web(getattr(theme, name)) for name in ("fault", "caution", "ground"))
    lit = _web(_mixed(theme.field, theme.chosen, 0.30))
    return f"""
        QWidget {{ color: {ink}; }}
        QMainWindow, QMenuBar, QStatusBar, QDialog {{ background: {panel}; }}
        QMenuBar::item {{ padding: 4px 9px; background: transparent; }}
        QMenuBar::item:selected, QMenu::item:selected {{ background: {lit}; }}
        QMenu {{ background: {raised}; border: 1px solid {edge}; padding: 4px 0; }}
        QMenu::item {{ padding: 4px 28px 4px 24px; }}
        QMenu::separator {{ height: 1px; background: {line}; margin: 4px 8px; }}
        QMenu::item:disabled, QPushButton:disabled {{ color: {_web(_mixed(theme.quiet_ink, theme.panel, 0.35))}; }}
        QPushButton, QComboBox {{ background: {raised}; border: 1px solid {edge}; border-radius: 3px; padding: 3px 9px; }}
        QPushButton:hover, QComboBox:hover {{ border-color: {ink}; }}
        QPushButton:focus, QComboBox:focus, QLineEdit:focus {{ border: 2px solid {chosen}; padding: 2px 8px; }}
        QPushButton:pressed, QPushButton:checked {{ background: {lit}; }}
        QPushButton#mend {{ text-align: left; }}
        QLineEdit {{ background: {field}; border: 1px solid {edge}; border-radius: 3px; padding: 3px 6px; }}
        QPlainTextEdit, QListWidget, QScrollArea, QScrollArea > QWidget > QWidget, QTableWidget, QTextBrowser {{
            background: {field}; border: none; }}
        QPlainTextEdit {{ selection-background-color: {lit}; selection-color: {ink}; border-top: 2px solid {field}; }}
        QPlainTextEdit:focus {{ border-top: 2px solid {chosen}; }}
        QListWidget::item {{ padding: 3px 6px; }}
        QListWidget::item:selected {{ background: {lit}; color: {ink}; border-left: 3px solid {chosen}; }}
        QListWidget:focus {{ border-top: 2px solid {chosen}; }}
        QTabWidget::pane {{ border: none; }}
        QTabBar::tab {{ background: {panel}; color: {quiet}; padding: 4px 12px; border-bottom: 2px solid transparent; }}
        QTabBar::tab:selected {{ color: {ink}; border-bottom: 2px solid {chosen}; }}
        QTabBar::tab:focus {{ color: {chosen}; }}
        QSplitter::handle {{ background: {line}; }}
        QSplitter::handle:hover {{ background: {chosen}; }}
        QFrame#notice {{ background: {raised}; border-left: 4px solid {caution}; }}
        QFrame#fault {{ background: {raised}; border-left: 4px solid {fault}; }}
        QFrame#help {{ background: {raised}; border-left: 4px solid {chosen}; }}
        QLabel#quiet {{ color: {quiet}; }}
        QToolTip {{ background: {raised}; color: {ink}; border: 1px solid {edge}; padding: 3px; }}
        QStatusBar::item {{ border: none; }}
        QScrollBar {{ background: {panel}; border: none; }}
        QScrollBar:vertical {{ width: 12px; }}
        QScrollBar:horizontal {{ height: 12px; }}
        QScrollBar::handle {{ background: {edge}; border: 3px solid {panel}; border-radius: 5px; min-height: 24px; min-width: 24px; }}
        QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
        QScrollBar::add-page, QScrollBar::sub-page {{ background: {ground}; }}
        QComboBox QAbstractItemView {{ background: {raised}; border: 1px solid {edge}; selection-background-color: {lit}; }}
        QHeaderView::section {{ background: {panel}; color: {quiet}; border: none; padding: 3px 6px; }}
        QCheckBox::indicator {{ width: 13px; height: 13px; border: 1px solid {edge}; background: {field}; }}
        QCheckBox::indicator:checked {{ background: {chosen}; }}
        QProgressBar {{ background: {field}; border: 1px solid {edge}; text-align: center; }}
        QProgressBar::chunk {{ background: {lit}; }}
    """


def dress(application: QApplication, theme: Theme) -> None:
    """Have the whole application in a theme."""
    application.setStyle("Fusion")
    application.setPalette(palette_of(theme))
    application.setStyleSheet(sheet_of(theme))
