"""What each row of the table of actions does: a method `do_NAME` each."""

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QApplication, QFileDialog

from composer.editor.finding import Where
from composer.editor.keys_sheet import KeysSheet
from composer.edits.edit import Refusal

_DELETE = Qt.WidgetAttribute.WA_DeleteOnClose
SCORES = "Scores (*.score)"

FIRST_HELP = (
    "1  Write on the left: the cloth on the right follows. Ctrl + Space completes a word, F1 shows all keys.",
    "2  Click a thread: the caret goes to the line that moves it. Drag a hit or a knot: that one number changes in the text.",
    "3  F8 goes from snag to snag; the buttons beside the list mend it. Ctrl + Z takes anything back.",
)


class Deeds:
    """The actions of the window, by the names of the table."""

    # ---- score ----------------------------------------------------------------------------------------------------------

    def do_new(self) -> None:
        """Begin a score."""
        self.leave_then(self.session.new)

    def do_open(self) -> None:
        """Open a score, chosen in a dialog that lets the rest go on."""
        self._dialog(
            "Open a score", QFileDialog.AcceptMode.AcceptOpen, lambda path: self.leave_then(lambda: self.session.open(path))
        )

    def do_save(self) -> None:
        """Save, or ask for a name first."""
        self.save_then(None)

    def do_save_as(self) -> None:
        """Save under another name."""
        self._dialog("Save the score", QFileDialog.AcceptMode.AcceptSave, self.session.save_as)

    def save_then(self, then: Any) -> None:
        """Save, with a name asked for where there is none, and go on from there."""
        if self.session.path is not None:
            self.session.save(then)
        else:
            self._dialog("Save the score", QFileDialog.AcceptMode.AcceptSave, lambda path: self.session.save_as(path, then))

    def leave_then(self, then: Any) -> None:
        """Go on where nothing is lost by it; else say so first."""
        if not self.session.modified:
            then()
            return
        self.notices.say(
            "leave",
            f"{self.session.name} is not saved.",
            [
                ("Save it first", lambda: self.save_then(then)),
                ("Go on without saving", then),
                ("Stay here", self.pane.setFocus),
            ],
        )

    def _dialog(self, title: str, mode: QFileDialog.AcceptMode, then: Any, kinds: str = SCORES, ending: str = "score") -> None:
        dialog = QFileDialog(self, title)
        dialog.setAcceptMode(mode)
        dialog.setNameFilters([kinds, "All files (*)"])
        dialog.setDefaultSuffix(ending)
        if mode == QFileDialog.AcceptMode.AcceptOpen:
            dialog.setFileMode(QFileDialog.FileMode.ExistingFile)
        dialog.setAttribute(_DELETE)
        dialog.fileSelected.connect(then)
        dialog.open()

    def do_print(self) -> None:
        """Cloth and snags as pages."""
        self._dialog("Print to PDF", QFileDialog.AcceptMode.AcceptSave, self.print_to, "PDF pages (*.pdf)", "pdf")

    def print_to(self, path: str) -> None:
        """Print into a file."""
        self.printer.start(path, self.snags.rows)

    def do_quit(self) -> None:
        """Close the window."""
        self.close()

    # ---- edit -----------------------------------------------------------------------------------------------------------

    def do_undo(self) -> None:
        """Take back what was done last."""
        self.pane.undo()

    def do_redo(self) -> None:
        """Do it again."""
        self.pane.redo()

    def do_cut(self) -> None:
        """Cut."""
        self._edited().cut()

    def do_copy(self) -> None:
        """Copy."""
        self._edited().copy()

    def do_paste(self) -> None:
        """Paste."""
        self._edited().paste()

    def do_choose_all(self) -> None:
        """Choose everything."""
        self._edited().selectAll()

    def _edited(self) -> Any:
        """What cut and paste are for: a line that is written in, or the text."""
        focus = QApplication.focusWidget()
        return focus if hasattr(focus, "cut") and hasattr(focus, "paste") else self.pane

    def do_complete(self) -> None:
        """Offer all that may stand at the caret."""
        self.pane.setFocus()
        place = self.pane.place

        def show(offers: Any) -> None:
            if self.pane.place == place:
                self.offers.offer(offers if isinstance(offers, tuple) else ())

        self.crew.ask("complete", place, show)

    def do_explain(self) -> None:
        """Say what the word at the caret means."""
        self.pane.ask_here()

    def do_comment(self) -> None:
        """Comment, or not."""
        self.pane.toggle_comment()

    def do_copy_phrase(self) -> None:
        """A copy of the phrase for one entry alone."""
        line = self.pane.place[0]
        lit = self.pane.looks.lit
        entry = self._entry if self._entry and line in lit else line

        def make(edit: Any) -> None:
            if isinstance(edit, Refusal):
                self.foot.say("word", edit.say)
            else:
                self.apply(edit)

        self.crew.ask("copy", (entry,), make)

    def do_find(self) -> None:
        """Show the line that finds."""
        self.find_line.open()

    def do_find_next(self) -> None:
        """The next one."""
        self.find_line.next()

    def do_find_previous(self) -> None:
        """The one before."""
        self.find_line.previous()

    def do_go(self) -> None:
        """Show the line that goes somewhere."""
        self.go_line.open()

    def go_where(self, where: Where) -> None:
        """Go to a line, a place, or what has a name."""
        if where.line:
            self.pane.go_to(where.line, where.column)
        elif where.bar:
            self.crew.ask("seconds", (where.bar, where.count), self._go_to_seconds)
        elif where.seconds is not None:
            self._go_to_seconds(where.seconds)
        else:
            self._go_to_name(where.name)

    def _go_to_name(self, name: str) -> None:
        """To the statement that makes something of that name; a cue takes the play head along."""
        picture = self.showing.known.picture
        for cue in picture.cues if picture is not None else ():
            if cue.name.lower() == name.lower():
                self._go_to_seconds(cue.seconds)
        for number, line in enumerate(self.pane.text.split("\n"), 1):
            words = line.split(None, 2)
            if (
                len(words) > 1
                and words[0] in ("phrase", "section", "group", "cue")
                and words[1].strip('"').lower() == name.lower()
            ):
                self.pane.go_to(number)
                return
        self.foot.say("word", f"Nothing here is called '{name}'.")

    def _go_to_seconds(self, seconds: Any) -> None:
        """The play head, and the cloth, to an instant as written."""
        if isinstance(seconds, Refusal) or seconds is None:
            self.foot.say("word", "There is no such place." if seconds is None else seconds.say)
            return
        cloth = self.stage.cloth
        begin, end = cloth.shown
        if not begin <= seconds <= end:
            cloth.show_stretch(seconds - (end - begin) / 2, seconds + (end - begin) / 2)
        self.stage.transport.move_to(self.showing.known.warp(self.showing.as_retimed).now(float(seconds)))

    # ---- snags and retiming ---------------------------------------------------------------------------------------------

    def do_next_snag(self) -> None:
        """The next snag."""
        self.lists.setCurrentIndex(0)
        self.snags.step(1)

    def do_previous_snag(self) -> None:
        """The snag before."""
        self.lists.setCurrentIndex(0)
        self.snags.step(-1)

    def do_mend(self) -> None:
        """To the choices for the chosen snag."""
        self.lists.setCurrentIndex(0)
        if self.snags.current is None:
            self.snags.step(1)
        self.snags.to_choices()

    def do_take_hit(self) -> None:
        """The retiming of the chosen hit into the text."""
        at = self.retimed.list.currentRow()
        if 0 <= at < len(self.retimed.hits):
            hit = self.retimed.hits[at]
            self.take(hit.was_s, hit.was_s)
        else:
            self.lists.setCurrentIndex(1)
            self.retimed.list.setFocus()
            self.foot.say("word", "Choose a hit in the list first.")

    def do_take_passage(self) -> None:
        """The retiming of the looped passage into the text."""
        loop = self.stage.transport.head.loop_s
        if loop is None:
            self.foot.say("word", "There is no passage yet: Ctrl + I and Ctrl + Shift + I say where it begins and ends.")
            return
        warp = self.showing.known.warp(self.showing.as_retimed)
        self.take(warp.was(loop[0]), warp.was(loop[1]))

    def do_take_all(self) -> None:
        """All of the retiming into the text."""
        self.take(0.0, float("inf"))

    def take(self, from_s: float, to_s: float) -> None:
        """The retiming between two written instants into the text, as one step."""

        def make(taken: Any) -> None:
            if isinstance(taken, Refusal):
                self.notices.say("take", taken.say)
                return
            self.apply(taken.edit)
            if taken.notes:
                self.notices.say("take", " ".join(taken.notes))

        self.notices.drop("take")
        self.foot.say("word", "taking the retiming in …")
        self.crew.ask("take", (from_s, to_s), make)

    # ---- help -----------------------------------------------------------------------------------------------------------

    def do_keys(self) -> None:
        """The sheet of keys; where it is there, away with it."""
        there = self.findChild(KeysSheet, options=Qt.FindChildOption.FindDirectChildrenOnly)
        if there is not None and there.isVisible():
            there.put_away()
        else:
            KeysSheet(self).bring()

    def do_first_help(self) -> None:
        """Three lines on what to try."""
        self.notices.say("first", "\n".join(FIRST_HELP), kind="help")

    def do_about(self) -> None:
        """Which version this is."""
        from importlib.metadata import version

        self.notices.say("about", f"Drawcord {version('drawcord')}: motion for fluid-driven fibers, composed and played.")
