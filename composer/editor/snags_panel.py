"""The list of snags, each a sentence, and beside it what would mend the one that is chosen, a button each."""

from collections.abc import Sequence

from PySide6.QtCore import QEvent, QObject, QSize, Qt, Signal
from PySide6.QtGui import QKeyEvent
from PySide6.QtWidgets import (
    QAbstractItemView,
    QHBoxLayout,
    QLabel,
    QListWidget,
    QListWidgetItem,
    QPushButton,
    QScrollArea,
    QSizePolicy,
    QVBoxLayout,
    QWidget,
)

from composer.editor.messages import Choice, Mended, Row
from composer.edits.edit import Refusal

WAYS = {
    "time": "Give it time",
    "lead": "Let it lead",
    "shrink": "Shrink it",
    "air": "Ask less of the air",
    "retime": "Let the retimer do it",
    "pin": "Pin this",
}
"""What each way to mend is called where it is said why it does not help."""


def snags_in_words(count: int) -> str:
    """A count of snags as it is said wherever snags are counted: one for each fiber and move, as `drawcord check` counts."""
    return "no snags" if not count else f"{count} snag{'s' * (count != 1)}"


def with_count(row: Row) -> str:
    """What would mend a row's snags, and how many they are where they are several."""
    return f"{row.mends} ({snags_in_words(row.count)})" if row.count > 1 else row.mends


class Wrapped(QListWidget):
    """A list of sentences that are wrapped to its width."""

    def __init__(self, name: str):
        super().__init__()
        self.setAccessibleName(name)
        self.setWordWrap(True)
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.setVerticalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.setResizeMode(QListWidget.ResizeMode.Adjust)
        self.setSpacing(1)

    def sizeHint(self) -> QSize:
        """Not so wide as its longest sentence."""
        return QSize(300, 150)


class Sentence(QPushButton):
    """A button with a sentence on it, wrapped to its width, and quieter words below; Return presses it too."""

    def __init__(self, says: str, quiet: str):
        super().__init__()
        self.setObjectName("mend")
        self.setAccessibleName(f"{says}, {quiet}")
        column = QVBoxLayout(self)
        column.setContentsMargins(6, 3, 6, 3)
        column.setSpacing(0)
        for text, name in ((says, ""), (quiet, "quiet")):
            label = QLabel(text)
            label.setWordWrap(True)
            label.setObjectName(name)
            label.setAttribute(Qt.WidgetAttribute.WA_TransparentForMouseEvents)
            label.setAccessibleName(text)
            column.addWidget(label)
        policy = QSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Minimum)
        policy.setHeightForWidth(True)
        self.setSizePolicy(policy)

    def hasHeightForWidth(self) -> bool:
        """As high as its sentence needs."""
        return True

    def heightForWidth(self, width: int) -> int:
        """The height for a width."""
        return self.layout().heightForWidth(width)

    def sizeHint(self) -> QSize:
        """The size for the width at hand."""
        width = max(self.width(), 120)
        return QSize(width, self.heightForWidth(width))

    def minimumSizeHint(self) -> QSize:
        """No narrower than a word or two."""
        return QSize(80, self.heightForWidth(max(self.width(), 80)))

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Return presses it."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter):
            self.click()
        else:
            super().keyPressEvent(event)


class Mends(QScrollArea):
    """The choices for one snag. ghost: the choice under pointer or focus, None for none; chosen: one that is taken.

    left: the keys go back to the list; come: choices are there
    """

    come = Signal()
    ghost = Signal(object)
    chosen = Signal(object)
    left = Signal()

    def __init__(self) -> None:
        super().__init__()
        self.setWidgetResizable(True)
        self.setAccessibleName("what would mend it")
        self.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self._buttons: dict[QObject, Choice] = {}
        self.say("Choose a snag: what would mend it comes up here.")

    def sizeHint(self) -> QSize:
        """About as wide as a sentence."""
        return QSize(260, 150)

    @property
    def choices(self) -> tuple[Choice, ...]:
        """The choices shown."""
        return tuple(self._buttons.values())

    @property
    def buttons(self) -> tuple[QPushButton, ...]:
        """Their buttons."""
        return tuple(self._buttons)

    def say(self, says: str) -> None:
        """Show a sentence alone."""
        self._fill([_label(says)])

    def show_mended(self, mended: Mended | Refusal) -> None:
        """Show the choices, and why the other ways do not help."""
        if isinstance(mended, Refusal):
            self.say(mended.say)
            return
        self._buttons = {}
        parts: list[QWidget] = []
        made: dict[QObject, Choice] = {}
        for choice in mended.choices:
            button = Sentence(choice.say, f"leaves {snags_in_words(choice.snags_left)}")
            button.installEventFilter(self)
            button.clicked.connect(lambda _=False, choice=choice: self.chosen.emit(choice))
            made[button] = choice
            parts.append(button)
        if not parts:
            parts.append(_label("Nothing that is tried here mends it:"))
        parts += [_label(f"{WAYS[way]}: {says[:1].lower()}{says[1:]}", quiet=True) for way, says in mended.not_these.items()]
        self._fill(parts)
        self._buttons = made
        self.come.emit()

    def _fill(self, parts: Sequence[QWidget]) -> None:
        if self._buttons:
            self._buttons = {}
            self.ghost.emit(None)
        inner = QWidget()
        column = QVBoxLayout(inner)
        column.setContentsMargins(6, 4, 6, 4)
        column.setSpacing(4)
        for part in parts:
            column.addWidget(part)
        column.addStretch(1)
        self.setWidget(inner)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Pointer or focus on a choice shows what would come of it."""
        choice = self._buttons.get(watched)
        if choice is not None:
            if event.type() in (QEvent.Type.Enter, QEvent.Type.FocusIn):
                self.ghost.emit(choice)
            elif event.type() in (QEvent.Type.Leave, QEvent.Type.FocusOut):
                self.ghost.emit(None)
            elif isinstance(event, QKeyEvent) and event.type() == QEvent.Type.KeyPress:
                if event.key() in (Qt.Key.Key_Left, Qt.Key.Key_Escape):
                    self.left.emit()
                    return True
                if event.key() in (Qt.Key.Key_Up, Qt.Key.Key_Down):
                    buttons = self.buttons
                    at = buttons.index(watched) + (1 if event.key() == Qt.Key.Key_Down else -1)
                    buttons[at % len(buttons)].setFocus()
                    return True
        return super().eventFilter(watched, event)


def _label(says: str, quiet: bool = False) -> QLabel:
    label = QLabel(says)
    label.setWordWrap(True)
    label.setAccessibleName(says)
    if quiet:
        label.setObjectName("quiet")
    return label


class SnagsPanel(QWidget):
    """Snags, and what would mend them.

    row_chosen: a row that was gone to; mends_wanted: a row for which choices are to be found
    """

    row_chosen = Signal(object)
    mends_wanted = Signal(object)

    def __init__(self) -> None:
        super().__init__()
        self._rows: tuple[Row, ...] = ()
        self._at: tuple | None = None
        self.setAccessibleName("snags")
        self._list = Wrapped("list of snags")
        self._list.currentRowChanged.connect(self._changed)
        self._list.itemActivated.connect(lambda _: self.mends.setFocus())
        self._list.installEventFilter(self)
        self.mends = Mends()
        self.mends.left.connect(self._list.setFocus)
        self.mends.come.connect(self._choices_come)
        self._to_choices = False
        self._last_s: float | None = None
        row = QHBoxLayout(self)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(1)
        row.addWidget(self._list, 3)
        row.addWidget(self.mends, 2)

    @property
    def list(self) -> Wrapped:
        """The list itself."""
        return self._list

    @property
    def rows(self) -> tuple[Row, ...]:
        """What it lists."""
        return self._rows

    @property
    def current(self) -> Row | None:
        """The row that is chosen."""
        at = self._list.currentRow()
        return self._rows[at] if 0 <= at < len(self._rows) else None

    def show_rows(self, rows: Sequence[Row], notes: Sequence[str] = (), more: int = 0) -> None:
        """List these; the one that was chosen stays so where it is still there."""
        before = self.current
        self._rows = tuple(rows)
        self._list.blockSignals(True)
        self._list.clear()
        for row in rows:
            says = f"{row.says} {with_count(row)}"
            item = QListWidgetItem(f"{row.place}  {says}")
            item.setData(Qt.ItemDataRole.AccessibleTextRole, f"snag at {row.place}, line {row.line}: {says}")
            item.setToolTip(f"line {row.line}" + (f", phrase in line {row.phrase_line}" if row.phrase_line else ""))
            self._list.addItem(item)
        for note in (*notes, *([f"and {more} more snags later in the score"] if more else [])):
            item = QListWidgetItem(note)
            item.setFlags(Qt.ItemFlag.ItemIsEnabled)
            self._list.addItem(item)
        if not rows and not notes:
            item = QListWidgetItem("No snags: the rig can do all of it.")
            item.setFlags(Qt.ItemFlag.ItemIsEnabled)
            self._list.addItem(item)
        at = next((n for n, row in enumerate(rows) if before is not None and _same(row, before)), -1)
        self._list.setCurrentRow(at)
        self._list.blockSignals(False)
        if at < 0:
            self.mends.say("Choose a snag: what would mend it comes up here." if rows else "")
        else:
            self.mends_wanted.emit(self._rows[at])

    def to_choices(self) -> None:
        """Put the keys on the first choice for the chosen snag; where it is still looked for, as soon as it comes."""
        if self.mends.buttons:
            self.mends.buttons[0].setFocus()
        else:
            self._list.setFocus()
            self._to_choices = True

    def _choices_come(self) -> None:
        if self._to_choices and self._list.hasFocus() and self.mends.buttons:
            self.mends.buttons[0].setFocus()
        self._to_choices = False

    def clear(self) -> None:
        """Nothing is known."""
        self._rows, self._last_s = (), None
        self._list.clear()
        self.mends.say("")

    def choose(self, snag: int) -> None:
        """Choose the row that tells of a snag (index into the check's), without going there."""
        at = next((n for n, row in enumerate(self._rows) if snag in (row.snag, *row.others)), None)
        if at is not None:
            self._list.blockSignals(True)
            self._list.setCurrentRow(at)
            self._list.blockSignals(False)
            self._last_s = self._rows[at].from_s
            self.mends_wanted.emit(self._rows[at])

    def step(self, way: int) -> None:
        """Go to the next row, or the one before; where the one chosen last has been mended, on from where it was."""
        if self._rows:
            at = self._list.currentRow()
            if at < 0 and self._last_s is not None:
                later = next((n for n, row in enumerate(self._rows) if row.from_s >= self._last_s), len(self._rows))
                at = later - 1 if way > 0 else later
            elif at < 0:
                at = -1 if way > 0 else 0
            self._list.setCurrentRow((at + way) % len(self._rows))

    def _changed(self, at: int) -> None:
        self._to_choices = False
        if 0 <= at < len(self._rows):
            self._last_s = self._rows[at].from_s
            self.row_chosen.emit(self._rows[at])
            self.mends_wanted.emit(self._rows[at])

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        """Return in the list goes to the choices."""
        pressed = event.key() if isinstance(event, QKeyEvent) and event.type() == QEvent.Type.KeyPress else None
        if pressed in (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Right) and self.current is not None:
            self.to_choices()
            return True
        return super().eventFilter(watched, event)


def _same(row: Row, other: Row) -> bool:
    like = all(getattr(row, name) == getattr(other, name) for name in ("kind", "line", "phrase_line", "fibers"))
    return like and abs(row.from_s - other.from_s) < 0.5
