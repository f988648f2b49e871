"""What each row of the table of actions does: a method `do_NAME` each."""

from typing import Any

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QApplication, QFileDialog

from composer.editor.finding import Where
from composer.editor.keys_sheet import KeysSheet
from composer.editor.stage import CLOTH, HANG, RIG
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
        self.crew.ask(
            "complete", self.pane.place, lambda offers: self.offers.offer(offers if isinstance(offers, tuple) else ())
        )

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
        buttons = self.snags.mends.buttons
        (buttons[0] if buttons else self.snags.list).setFocus()

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

        self.foot.say("word", "taking the retiming in …")
        self.crew.ask("take", (from_s, to_s), make)

    # ---- view -----------------------------------------------------------------------------------------------------------

    def do_beside(self, on: bool) -> None:
        """The retiming beside the written, or not."""
        self.showing.show_beside(on)

    def do_simulated(self, on: bool) -> None:
        """Play as retimed, or as written."""
        self.showing.play_as_retimed(on)
        self.crew.simulate_retimed(on)

    def do_show_cloth(self) -> None:
        """The cloth."""
        self.stage.open(CLOTH)

    def do_show_hang(self) -> None:
        """The hanging fibers."""
        self.stage.open(HANG)

    def do_show_rig(self) -> None:
        """The rig."""
        self.stage.open(RIG)

    def parts(self) -> list[Any]:
        """The parts of the window in the order in which F6 goes round."""
        shown = self.stage.content(self.stage.shown)
        shown = getattr(shown, "table", shown)
        lists = self.snags.list if self.lists.currentIndex() == 0 else self.retimed.list
        return [self.pane, shown, self.strand, lists]

    def do_next_part(self) -> None:
        """The keys to the next part."""
        self._step_part(1)

    def do_previous_part(self) -> None:
        """The keys to the part before."""
        self._step_part(-1)

    def _step_part(self, way: int) -> None:
        parts, focus = self.parts(), QApplication.focusWidget()
        here = next((at for at, part in enumerate(parts) if part is focus or (focus and part.isAncestorOf(focus))), None)
        if here is None:
            here = 3 if focus and self.lists.isAncestorOf(focus) else 1 if focus and self.stage.isAncestorOf(focus) else -way
        parts[(here + way) % len(parts)].setFocus()

    def do_text_part(self) -> None:
        """The keys to the text."""
        self.pane.setFocus()

    def do_larger(self) -> None:
        """All letters larger."""
        self._resize_letters(1.125)

    def do_smaller(self) -> None:
        """All letters smaller."""
        self._resize_letters(1 / 1.125)

    def _resize_letters(self, factor: float) -> None:
        self._own_scale = min(max(self._own_scale * factor, 0.5), 3.0)
        self._fit_letters()

    def do_theme(self) -> None:
        """Light or dark."""
        self.set_theme("light" if self.theme_name == "dark" else "dark")
        self.settings.setValue("theme", self.theme_name)

    # ---- play -----------------------------------------------------------------------------------------------------------

    def do_play(self) -> None:
        """Play or pause."""
        self.stage.transport.toggle()

    def do_to_start(self) -> None:
        """To the start."""
        self.stage.transport.to_start()

    def do_head_here(self) -> None:
        """The play head to where the caret's line first moves something."""

        def go(stretches: Any) -> None:
            if stretches is None or isinstance(stretches, Refusal) or not len(stretches.from_s):
                self.foot.say("word", "This line moves nothing.")
            else:
                self._go_to_seconds(float(stretches.from_s.min()))

        self.crew.ask("moved", self.pane.place[:1], go)

    def do_loop_from(self) -> None:
        """The passage begins here."""
        self.stage.transport.mark_loop_start()

    def do_loop_to(self) -> None:
        """The passage ends here."""
        self.stage.transport.mark_loop_end()

    def do_no_loop(self) -> None:
        """No passage."""
        self.stage.transport.clear_loop()

    def do_slower(self) -> None:
        """A step slower."""
        self.stage.transport.step_speed(-1)

    def do_faster(self) -> None:
        """A step faster."""
        self.stage.transport.step_speed(1)

    def do_half_speed(self) -> None:
        """Half speed, or whole."""
        transport = self.stage.transport
        transport.set_speed(1.0 if transport.head.speed == 0.5 else 0.5)

    def do_clicks(self) -> None:
        """The counts heard, or not."""
        transport = self.stage.transport
        transport.set_counts_sound(not transport.counts_sound)

    def do_finer_grid(self) -> None:
        """A finer grid."""
        self.foot.step_grid(1)

    def do_coarser_grid(self) -> None:
        """A coarser grid."""
        self.foot.step_grid(-1)

    # ---- help -----------------------------------------------------------------------------------------------------------

    def do_keys(self) -> None:
        """The sheet of keys."""
        sheet = KeysSheet(self)
        sheet.setAttribute(_DELETE)
        sheet.show()

    def do_first_help(self) -> None:
        """Three lines on what to try."""
        self.notices.say("first", "\n".join(FIRST_HELP), kind="help")

    def do_about(self) -> None:
        """Which version this is."""
        from importlib.metadata import version

        self.notices.say("about", f"Drawcord {version('drawcord')}: motion for fluid-driven fibers, composed and played.")
