"""Bars above the text that say what has happened and offer what can be done; nothing waits for them."""

from collections.abc import Callable, Sequence

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QPushButton, QSizePolicy, QVBoxLayout, QWidget

Choice = tuple[str, Callable[[], None]]


class Notices(QWidget):
    """Notices by name: another of the same name takes the place of the one before. answered: a button was pressed."""

    answered = Signal()

    def __init__(self, parent: QWidget | None = None):
        super().__init__(parent)
        self._rows = QVBoxLayout(self)
        self._rows.setContentsMargins(0, 0, 0, 0)
        self._rows.setSpacing(1)
        self._shown: dict[str, _Notice] = {}
        self.setAccessibleName("notices")
        self.hide()

    @property
    def said(self) -> dict[str, str]:
        """What is said now, by name."""
        return {name: notice.says for name, notice in self._shown.items()}

    def say(self, name: str, says: str, choices: Sequence[Choice] = (), kind: str = "notice") -> None:
        """Say something. A choice takes its bar away; a bar without choices has one that does nothing else."""
        self.drop(name)
        notice = _Notice(says, [*choices, ("Close", lambda: None)] if not choices else list(choices), kind)
        notice.on_done = lambda: self.drop(name)
        notice.on_answered = self.answered.emit
        self._shown[name] = notice
        self._rows.addWidget(notice)
        self.show()

    def drop(self, name: str) -> None:
        """Take a bar away."""
        notice = self._shown.pop(name, None)
        if notice is not None:
            self._rows.removeWidget(notice)
            notice.hide()
            notice.deleteLater()
        self.setVisible(bool(self._shown))

    def choose(self, name: str, word: str) -> None:
        """Press a button of a bar."""
        self._shown[name].press(word)


class _Notice(QFrame):
    def __init__(self, says: str, choices: Sequence[Choice], kind: str):
        super().__init__()
        self.says = says
        self.on_done: Callable[[], None] = lambda: None
        self.on_answered: Callable[[], None] = lambda: None
        self.setObjectName(kind)
        self.setAccessibleName("notice")
        row = QHBoxLayout(self)
        row.setContentsMargins(10, 4, 6, 4)
        label = QLabel(says)
        label.setWordWrap(True)
        label.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        label.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Preferred)
        label.setAccessibleName(says)
        row.addWidget(label, 1)
        self._buttons: dict[str, QPushButton] = {}
        for word, does in choices:
            button = QPushButton(word)
            button.setAccessibleName(word)
            button.clicked.connect(lambda _=False, does=does: self._chosen(does))
            row.addWidget(button)
            self._buttons[word] = button

    def press(self, word: str) -> None:
        self._buttons[word].click()

    def _chosen(self, does: Callable[[], None]) -> None:
        self.on_done()
        does()
        self.on_answered()
