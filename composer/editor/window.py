"""The compose window: its parts, where they are, and who tells whom what."""

from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QPoint, QSettings, QSize, Qt, QTimer
from PySide6.QtGui import QAction, QCloseEvent, QKeySequence
from PySide6.QtWidgets import QComboBox, QMainWindow, QMenu, QSplitter, QTabWidget, QToolTip, QVBoxLayout, QWidget

from composer.editor import disk
from composer.editor.actions import ACTIONS, by_menu
from composer.editor.background import Later
from composer.editor.between import Between
from composer.editor.crew import Crew
from composer.editor.deeds import Deeds
from composer.editor.deltas import Delta, counted
from composer.editor.finding import FindLine, GoLine
from composer.editor.foot import Foot
from composer.editor.hand import Hand
from composer.editor.manners import LETTERS_MS, Manners
from composer.editor.notices import Notices
from composer.editor.offers import Offers
from composer.editor.pane import TextPane
from composer.editor.printing import Printer
from composer.editor.retimed_panel import RetimedPanel
from composer.editor.session import Session
from composer.editor.showing import Showing
from composer.editor.sights import Sights
from composer.editor.snags_panel import SnagsPanel
from composer.editor.stage import Stage
from composer.edits.edit import Edit, Refusal, lines_after
from composer.picture.palette import THEMES
from composer.picture.strand.strand_view import StrandView

if TYPE_CHECKING:
    from composer.edits.completion import Offer

SIZE = QSize(1280, 800)
MOST_SHOWN = 40
"""Changes of an edit whose lines are lit when it has been made."""


class ComposeWindow(Deeds, Sights, Between, Manners, QMainWindow):
    """Everything that belongs to one score on the screen."""

    def __init__(self, crew: Crew | None = None):
        super().__init__()
        self.setObjectName("compose")
        self.resize(SIZE)
        self.settings = QSettings(disk.settings_path(), QSettings.Format.IniFormat)
        self.later = Later(self)
        self.pane = TextPane()
        self.offers = Offers(self.pane)
        self.notices = Notices()
        self.find_line, self.go_line = FindLine(self.pane), GoLine(self.pane)
        self.stage = Stage()
        self.strand = StrandView()
        self.snags, self.retimed = SnagsPanel(), RetimedPanel()
        self.foot = Foot()
        self.notices.answered.connect(self.pane.setFocus)
        self.session = Session(self.pane, self.notices, self.later, self)
        self.crew = crew if crew is not None else Crew(lambda: self.pane.text, self)
        self.crew.set_text(lambda: self.pane.text)
        self.showing = Showing(self.stage, self.strand, self.snags, self.retimed, self)
        self.hand = Hand(self.crew.ask, self)
        self.printer = Printer(self.crew, self.notices, self.later, self)
        self._names: dict[int, str] = {}
        self._entry = self._lines = 0
        self._shown_file = ""
        self._last_wrong = ""
        self._mends_early = False
        self._closing = False
        self._text_scale = 1.0
        self._own_scale = 1.0
        self._scale = 0.0
        self._theme = THEMES["dark"]
        self._letters = QTimer(self)
        self._letters.setSingleShot(True)
        self._letters.setInterval(LETTERS_MS)
        self._letters.timeout.connect(self._fit_letters)
        self.doings: dict[str, QAction] = {}
        self._lay_out()
        self._make_menus()
        self._wire()
        for box in self.findChildren(QComboBox):
            box.view().setAccessibleName(box.accessibleName())
        self._remember()

    # ---- parts ----------------------------------------------------------------------------------------------------------

    def _lay_out(self) -> None:
        left = QWidget()
        left.setAccessibleName("text")
        column = QVBoxLayout(left)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        for part in (self.find_line, self.go_line, self.pane):
            column.addWidget(part, 1 if part is self.pane else 0)
        self.lists = QTabWidget()
        self.lists.setDocumentMode(True)
        self.lists.setAccessibleName("snags, retiming")
        self.lists.tabBar().setAccessibleName("which list is shown")
        self.lists.addTab(self.snags, "Snags")
        self.lists.addTab(self.retimed, "Retiming")
        self.splits = {
            "upper": _split(Qt.Orientation.Horizontal, "between text and pictures", (left, self.stage), (500, 780)),
            "lower": _split(Qt.Orientation.Horizontal, "between strand and lists", (self.strand, self.lists), (640, 640)),
        }
        self.splits["whole"] = _split(
            Qt.Orientation.Vertical, "between text and strand", (self.splits["upper"], self.splits["lower"]), (530, 210)
        )
        inner = QWidget()
        whole = QVBoxLayout(inner)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.setSpacing(0)
        for part in (self.notices, self.splits["whole"], self.foot):
            whole.addWidget(part, 1 if part is self.splits["whole"] else 0)
        self.setCentralWidget(inner)

    def _make_menus(self) -> None:
        bar = self.menuBar()
        bar.setAccessibleName("menus")
        for name, actions in by_menu().items():
            menu = QMenu(name, self)
            bar.addMenu(menu)
            for one in actions:
                made = QAction(one.word, self)
                made.setToolTip(one.says)
                made.setStatusTip(one.says)
                if one.keys:
                    made.setShortcut(QKeySequence(one.keys))
                made.setCheckable(one.check)
                does = getattr(self, f"do_{one.name}")
                made.triggered.connect(does if one.check else lambda _=False, does=does: does())
                if one.parted:
                    menu.addSeparator()
                menu.addAction(made)
                self.doings[one.name] = made
            if name == "&Edit":
                menu.aboutToShow.connect(self._name_history)
        self.doings["beside"].setChecked(True)
        assert len(self.doings) == len(ACTIONS)

    def _wire(self) -> None:
        pane, crew, showing, stage = self.pane, self.crew, self.showing, self.stage
        pane.changed.connect(self._text_changed)
        pane.placed.connect(self._caret_placed)
        pane.asked.connect(self._explain)
        pane.typed.connect(self._typed)
        pane.refused.connect(lambda says: self.notices.say("paste", says))
        pane.letters_wanted.connect(self._letters_wanted)
        pane.document().modificationChanged.connect(lambda _: self._say_saved())
        self.offers.taken.connect(self._take_offer)
        self.go_line.wanted.connect(self.go_where)
        self.session.began.connect(self._began)
        self.session.named.connect(self._say_saved)
        self.session.saved.connect(lambda path: self.foot.say("word", f"Saved: {path}"))
        self.session.leaned_changed.connect(crew.again)
        self.session.rig_wanted.connect(self.do_complete)
        crew.said.connect(self._hear)
        crew.doing.connect(self._say_doing)
        crew.died.connect(lambda says: self.notices.say("worker", says, kind="fault"))
        showing.faults.connect(self._show_faults)
        showing.fiber_changed.connect(lambda fiber: showing.rig_page.choose(fiber) if showing.rig_page else None)
        stage.cloth.thread_clicked.connect(self.thread_chosen)
        stage.cloth.snag_chosen.connect(self._snag_on_cloth)
        stage.cloth.hit_dragged.connect(lambda segment, at, free: self.hand.carry(segment, at, None, free))
        stage.cloth.hit_dropped.connect(self.hand.let_go)
        self.strand.time_dragged.connect(lambda segment, at, free: self.hand.carry(segment, at, None, free))
        self.strand.target_dragged.connect(lambda segment, strain, free: self.hand.carry(segment, None, strain, free))
        self.strand.knot_dropped.connect(self.hand.let_go)
        self.strand.knot_clicked.connect(self._knot_clicked)
        self.hand.moved.connect(self._carried)
        self.hand.dropped.connect(self.apply)
        self.hand.refused.connect(lambda says: self.foot.say("word", says))
        self.hand.ended.connect(lambda: self.showing.carry(None))
        self.foot.grid_chosen.connect(self._set_grid)
        self.snags.row_chosen.connect(self._row_chosen)
        self.snags.mends_wanted.connect(self._find_mends)
        self.snags.mends.ghost.connect(showing.show_choice)
        self.snags.mends.chosen.connect(self._mend)
        self.retimed.hit_chosen.connect(self._hit_chosen)
        self.retimed.take_wanted.connect(self.take)
        stage.transport.loop_changed.connect(self._passage_changed)

    # ---- text -----------------------------------------------------------------------------------------------------------

    def _began(self, file: str, text: str) -> None:
        self.hand.forget()
        self._names = {}
        if file != self._shown_file:
            self._shown_file = file
            self.showing.forget()
            for at, word in enumerate(("Snags", "Retiming")):
                self.lists.setTabText(at, word)
            self.foot.say("snags", "")
            self.notices.drop("other")
        self.crew.begin(file, text)

    def _text_changed(self, delta: Delta) -> None:
        if self.hand.carries:
            self.hand.forget()
        self.crew.change(delta)
        self.showing.show_choice(None)
        self.notices.drop("take")
        if self.pane.blockCount() != self._lines:
            # What is lit was lit by its number, and the numbers are others now.
            self._lines, self._entry = self.pane.blockCount(), 0
            self.pane.looks.light([])
        document = self.pane.document()
        steps = document.availableUndoSteps()
        if not document.availableRedoSteps():
            self._names = {at: say for at, say in self._names.items() if at <= steps}

    def apply(self, edit: Edit) -> None:
        """Make an edit of the text as one step of its history."""
        self.pane.change(counted(self.pane.text, edit.changes))
        self._names[self.pane.document().availableUndoSteps()] = edit.say
        self.foot.say("word", edit.say)
        lines = lines_after(self.pane.text, edit.changes, MOST_SHOWN)
        self.pane.looks.light(lines)
        if lines:
            self.pane.show_line(lines[0])

    def _name_history(self) -> None:
        document = self.pane.document()
        steps = document.availableUndoSteps()
        for name, at, there in (("undo", steps, steps), ("redo", steps + 1, document.availableRedoSteps())):
            word = "&Undo" if name == "undo" else "&Redo"
            what = self._names.get(at, "typing")
            self.doings[name].setText(f"{word}: {what}" if there else word)
            self.doings[name].setEnabled(bool(there))

    def _caret_placed(self, line: int, column: int) -> None:
        self.foot.say("place", f"line {line}, column {column}")
        self._say_wrong(line)
        self.crew.ask("moved", (line,), self._light)

    def _say_wrong(self, line: int) -> None:
        """At the foot, what is wrong with the caret's line."""
        wrong = self.pane.looks.marks.get(line)
        if wrong:
            self.foot.say("word", wrong[0].says)
        elif self.foot.said("word") == self._last_wrong:
            self.foot.say("word", "")
        self._last_wrong = wrong[0].says if wrong else ""

    def _light(self, stretches: Any) -> None:
        found = None if isinstance(stretches, Refusal) or stretches is None or not len(stretches.fiber) else stretches
        self.showing.light(found)
        picture = self.showing.known.picture
        if found is not None and picture is not None:
            count = len(set(found.fiber.tolist()))
            first = picture.tempo.say_place(float(found.from_s.min()))
            line, column = self.pane.place
            what = f"moves {count} fiber{'s' * (count != 1)} from {first}"
            self.foot.say("place", f"{what}    line {line}, column {column}")

    def _typed(self, character: str) -> None:
        if character.isalnum() or character in "._-:/":
            self.crew.ask("complete", self.pane.place, self._offer_typed)
        else:
            self.offers.hide()

    def _offer_typed(self, offers: "tuple[Offer, ...]") -> None:
        """As one types, only what goes on from what is there is offered, and nothing that is there already."""
        before = self.pane.words_before()
        fitting = []
        for one in offers if isinstance(offers, tuple) else ():
            there = before[one.start - 1 :]
            # Numbers are typed, not chosen.
            if there[:1].isalpha() and one.text.lower().startswith(there.lower()) and one.text != there:
                fitting.append(one)
        self.offers.offer(fitting[:40] if before[-1:].strip() else [], asked_for=False)

    def _take_offer(self, offer: "Offer") -> None:
        line, column = self.pane.place
        self.pane.replace_columns(line, offer.start, max(offer.end, column), offer.text)

    def _explain(self, line: int, column: int, at: QPoint) -> None:
        marks = self.pane.looks.marks.get(line, ())
        wrong = [mark.says for mark in marks if not mark.start or mark.start <= column <= mark.end]
        if wrong:
            QToolTip.showText(at, "\n".join(wrong), self.pane)
            return

        def show(hover: Any) -> None:
            if hover is None or isinstance(hover, Refusal):
                QToolTip.hideText()
                return
            QToolTip.showText(at, "\n".join([hover.title, *hover.lines]), self.pane)
            self.pane.setAccessibleDescription(". ".join([hover.title, *hover.lines]))

        self.crew.ask("explain", (line, column), show)

    # ---- the end --------------------------------------------------------------------------------------------------------

    def closeEvent(self, event: QCloseEvent) -> None:
        """Where something is not saved, ask once, in a bar; who closes again finds the text at the next start."""
        if self.session.modified and not self._closing:
            event.ignore()
            self._closing = True
            self.notices.say(
                "close",
                "Something is not saved. Closing again keeps it for the next start.",
                [
                    ("Save and close", lambda: self.save_then(self._close_now)),
                    ("Keep it for the next start", self._close_now),
                    ("Throw it away", self._throw_away),
                    ("Go on writing", self._go_on),
                ],
            )
            return
        self._keep_settings()
        self.stage.transport.pause()
        self.session.close(keep=True)
        self.crew.end()
        self.later.end()
        event.accept()

    def _close_now(self) -> None:
        self._closing = True
        self.close()

    def _throw_away(self) -> None:
        self.pane.document().setModified(False)
        self._close_now()

    def _go_on(self) -> None:
        self._closing = False
        self.pane.setFocus()


def _split(way: Qt.Orientation, name: str, parts: tuple[QWidget, QWidget], sizes: tuple[int, int]) -> QSplitter:
    split = QSplitter(way)
    split.setAccessibleName(name)
    split.setChildrenCollapsible(False)
    split.setHandleWidth(4)
    for part, size in zip(parts, sizes, strict=True):
        split.addWidget(part)
        split.setStretchFactor(split.indexOf(part), size)
    split.setSizes(list(sizes))
    return split
