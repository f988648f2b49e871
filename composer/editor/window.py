"""The compose window: its parts, where they are, and who tells whom what."""

from typing import TYPE_CHECKING, Any

from PySide6.QtCore import QByteArray, QPoint, QSettings, QSize, Qt, QTimer
from PySide6.QtGui import QAction, QCloseEvent, QKeySequence, QResizeEvent
from PySide6.QtWidgets import QApplication, QComboBox, QMainWindow, QMenu, QSplitter, QTabWidget, QToolTip, QVBoxLayout, QWidget

from composer.editor import disk, dressing
from composer.editor.actions import ACTIONS, by_menu
from composer.editor.background import Later
from composer.editor.crew import Crew
from composer.editor.deeds import Deeds
from composer.editor.deltas import Delta, counted
from composer.editor.finding import FindLine, GoLine
from composer.editor.foot import Foot
from composer.editor.hand import Hand
from composer.editor.looks import Mark
from composer.editor.messages import Checked, Dragged, Failed, Retimed, Row, Told
from composer.editor.notices import Notices
from composer.editor.offers import Offers
from composer.editor.pane import TextPane
from composer.editor.printing import Printer
from composer.editor.retimed_panel import RetimedPanel
from composer.editor.session import Session
from composer.editor.showing import Showing
from composer.editor.snags_panel import SnagsPanel
from composer.editor.stage import Stage
from composer.edits.edit import Edit, Refusal
from composer.picture.palette import THEMES
from composer.picture.strand_view import StrandView

if TYPE_CHECKING:
    from composer.edits.completion import Offer

SIZE = QSize(1280, 800)
LETTERS_MS = 150
NEAR_S = 8.0
"""Seconds to either side of a snag that are shown when it is gone to."""


class ComposeWindow(Deeds, QMainWindow):
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
        self._entry = 0
        self._shown_file = ""
        self._last_wrong = ""
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
        document = self.pane.document()
        steps = document.availableUndoSteps()
        if not document.availableRedoSteps():
            self._names = {at: say for at, say in self._names.items() if at <= steps}

    def apply(self, edit: Edit) -> None:
        """Make an edit of the text as one step of its history."""
        self.pane.change(counted(self.pane.text, edit.changes))
        self._names[self.pane.document().availableUndoSteps()] = edit.say
        self.foot.say("word", edit.say)

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
        wrong = self.pane.looks.marks.get(line)
        if wrong:
            self.foot.say("word", wrong[0].says)
        elif self.foot.said("word") == self._last_wrong:
            self.foot.say("word", "")
        self._last_wrong = wrong[0].says if wrong else ""
        self.crew.ask("moved", (line,), self._light)

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
        if character.isalnum() or character in "._-:":
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

    # ---- what the workers say -------------------------------------------------------------------------------------------

    def _hear(self, message: Any) -> None:
        self.showing.hear(message)
        if isinstance(message, Checked):
            count = message.count
            self.foot.say("snags", "no snags" if not count else f"{count} snag{'s' * (count != 1)}")
            self.lists.setTabText(0, f"Snags, {len(message.rows)}" if message.rows else "Snags")
        elif isinstance(message, Retimed):
            self.lists.setTabText(1, f"Retiming, {len(message.hits)}" if message.hits else "Retiming")
        elif isinstance(message, Failed):
            self.notices.say("worker", message.says, kind="fault")

    def _say_doing(self, what: str) -> None:
        if what:
            run = self.showing.known.run
            share = f" {100 * run.share:.0f} %" if what == "simulating" and run is not None else ""
            self.foot.say("word", f"{what}{share} …")
        elif self.foot.said("word").endswith("…"):
            self.foot.say("word", "")

    def _show_faults(self, told: Told) -> None:
        name = self.session.base
        own = [one for one in told.faults if one.where.file == name]
        marks = [
            Mark(
                max(one.where.line, 1),
                one.where.column if one.where.line else 0,
                one.where.column + one.where.width,
                _says(one),
            )
            for one in own
        ]
        self.pane.looks.set_marks(marks)
        others = [one for one in told.faults if one.where.file != name]
        self.showing.show_rig_faults([one for one in others if one.where.file.endswith(".toml")])
        if others:
            first = others[0]
            more = f" (and {len(others) - 1} more)" if len(others) > 1 else ""
            says = f"{first.where.file}:{first.where.line}: {_says(first)}{more}. What is shown is the last that could be read."
            self.notices.say("other", says, kind="fault")
        else:
            self.notices.drop("other")
        if told.faults:
            self.foot.say("snags", f"{len(own) or len(others)} to mend in {'the text' if own else 'another file'}")
        self.session.lean_on(told.leans_on)

    # ---- cloth, strand, lists -------------------------------------------------------------------------------------------

    def thread_chosen(self, fiber: int, seconds: float) -> None:
        """A thread was chosen at an instant: its strand below, the caret on the line that moves it."""
        self.showing.show_fiber(fiber)
        self.crew.ask("source", (fiber, seconds), self._go_to_source)

    def _knot_clicked(self, segment: int, seconds: float) -> None:
        if self.strand.fiber is not None:
            self.crew.ask("source", (self.strand.fiber, seconds), self._go_to_source)

    def _go_to_source(self, source: Any) -> None:
        if source is None or isinstance(source, Refusal):
            self.foot.say("word", "Nothing has moved this fiber yet at that instant." if source is None else source.say)
            return
        self._entry = source.line
        span = source.move or source.entry
        self.pane.go_to(span.line, span.column, focus=False)
        self.pane.looks.light([span.line], [source.line])

    def _carried(self, dragged: Dragged) -> None:
        self.foot.say("word", dragged.edit.say)
        text = self.pane.text
        lines = [text.count("\n", 0, start) + 1 for start, _, _ in dragged.edit.changes]
        self.pane.looks.light(lines)
        if lines:
            self.pane.show_line(lines[0])
        if dragged.after is not None:
            self.showing.carry(dragged.after.tracks)

    def _set_grid(self, grid: Any) -> None:
        self.hand.grid = grid
        self.stage.cloth.set_grid(float(grid))
        self.strand.set_grid(float(grid))

    def _snag_on_cloth(self, index: int) -> None:
        self.lists.setCurrentIndex(0)
        self.snags.choose(index)

    def _row_chosen(self, row: Row) -> None:
        begin, end = self.stage.cloth.shown
        near = max(row.to_s - row.from_s, NEAR_S)
        if end - begin > 4.0 * near:
            middle = (row.from_s + row.to_s) / 2.0
            self.stage.cloth.show_stretch(middle - near, middle + near)
        self.stage.cloth.choose_snag(row.snag)
        if row.fibers:
            self.showing.show_fiber(row.fibers[0])
        if row.line:
            self._entry = row.line
            self.pane.go_to(row.line, focus=False)
            self.pane.looks.light([row.line], [row.phrase_line] if row.phrase_line else [])

    def _find_mends(self, row: Row) -> None:
        checked = self.showing.known.checked
        if checked is None or row.snag >= len(checked.check.snags):
            return
        self.snags.mends.say("Looking for what would mend it …")

        def show(mended: Any) -> None:
            if self.snags.current is not None and self.snags.current.snag == row.snag:
                self.snags.mends.show_mended(mended)

        self.crew.ask("mends", (checked.check.snags[row.snag],), show)

    def _mend(self, choice: Any) -> None:
        """Take a choice; the keys stay with the list, for the next snag."""
        self.snags.list.setFocus()
        self.apply(choice.edit)

    def _hit_chosen(self, hit: Any) -> None:
        length = self.stage.cloth.shown[1] - self.stage.cloth.shown[0]
        if not self.stage.cloth.shown[0] <= hit.was_s <= self.stage.cloth.shown[1]:
            self.stage.cloth.show_stretch(hit.was_s - length / 2, hit.was_s + length / 2)
        if hit.fibers:
            self.showing.show_fiber(hit.fibers[0])
        if hit.line:
            self.pane.go_to(hit.line, focus=False)
            self.pane.looks.light([hit.line])
        self.stage.transport.move_to(self.showing.known.warp(self.showing.as_retimed).now(hit.was_s))

    def _passage_changed(self, loop: Any) -> None:
        warp = self.showing.known.warp(self.showing.as_retimed)
        self.retimed.set_passage(None if loop is None else (warp.was(loop[0]), warp.was(loop[1])))

    # ---- looks ----------------------------------------------------------------------------------------------------------

    def _say_saved(self) -> None:
        modified = self.session.modified
        self.setWindowTitle(f"{self.session.name}{' (not saved)' if modified else ''} - Drawcord")
        unnamed = self.session.path is None
        self.foot.say("saved", "not saved; kept" if modified else "no name yet" if unnamed else "saved")

    def _letters_wanted(self, way: int) -> None:
        self._text_scale = min(max(self._text_scale * 1.1**way, 0.5), 4.0)
        self._letters.start(10)

    def _fit_letters(self, anew: bool = False) -> None:
        scale = min(max(dressing.scale_for(self.width(), self.height()) * self._own_scale, dressing.SMALLEST), dressing.LARGEST)
        if anew or (scale, self._text_scale) != self._scale:
            self._scale = (scale, self._text_scale)
            dressing.dress(QApplication.instance(), self._theme, scale, self._text_scale)

    def set_theme(self, name: str) -> None:
        """Everything in the colours of a theme."""
        self._theme = THEMES[name]
        self._fit_letters(anew=True)
        self.pane.looks.set_theme(self._theme)
        self.showing.set_theme(self._theme)

    @property
    def theme_name(self) -> str:
        """The theme in use."""
        return self._theme.name

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Letters grow with the window."""
        super().resizeEvent(event)
        if not self._scale:
            self._fit_letters()
        else:
            self._letters.start(LETTERS_MS)

    def _remember(self) -> None:
        """As it was when it was last closed."""
        settings = self.settings
        size = settings.value("size")
        if isinstance(size, QSize) and size.isValid():
            self.resize(size.expandedTo(QSize(640, 400)))
        if settings.value("largest") in (True, "true"):
            self.setWindowState(Qt.WindowState.WindowMaximized)
        for name, split in self.splits.items():
            state = settings.value(f"split/{name}")
            if isinstance(state, QByteArray):
                split.restoreState(state)
        self._own_scale = _number(settings.value("letters"), 1.0)
        self._text_scale = _number(settings.value("text letters"), 1.0)
        dark = QApplication.styleHints().colorScheme() != Qt.ColorScheme.Light
        name = str(settings.value("theme") or ("dark" if dark else "light"))
        self.set_theme(name if name in THEMES else "dark")

    def _keep_settings(self) -> None:
        self.settings.setValue("size", self.normalGeometry().size() if self.isMaximized() else self.size())
        self.settings.setValue("largest", self.isMaximized())
        for name, split in self.splits.items():
            self.settings.setValue(f"split/{name}", split.saveState())
        self.settings.setValue("letters", self._own_scale)
        self.settings.setValue("text letters", self._text_scale)
        self.settings.sync()

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


def _says(fault: Any) -> str:
    expected = f"; expected {fault.expected}" if fault.expected else ""
    hint = f" ({fault.hint})" if fault.hint else ""
    return f"{fault.found}{expected}{hint}"


def _number(value: Any, otherwise: float) -> float:
    try:
        found = float(value)
    except (TypeError, ValueError):
        return otherwise
    return found if 0.25 <= found <= 4.0 else otherwise
