"""What goes on between the parts of the window: what the workers say, what is chosen on cloth, strand and lists."""

from math import nextafter
from typing import Any

from composer.editor.looks import Mark
from composer.editor.messages import Checked, Dragged, Failed, Retimed, Row, Told
from composer.editor.snags_panel import snags_in_words
from composer.edits.edit import Refusal

NEAR_S = 8.0
"""Seconds to either side of a snag that are shown when it is gone to."""


class Between:
    """Who tells whom what, once somebody has spoken."""

    # ---- what the workers say -------------------------------------------------------------------------------------------

    def _hear(self, message: Any) -> None:
        self.showing.hear(message)
        if isinstance(message, Checked):
            words = snags_in_words(message.count)
            self.foot.say("snags", words)
            self.lists.setTabText(0, words.capitalize())
        elif isinstance(message, Retimed):
            self.lists.setTabText(1, retiming_in_words(len(message.hits)))
            row = self.snags.current
            if self._mends_early and row is not None and self.showing.known.retimed is message:
                # Ways that need a retiming were refused for want of it.
                self._find_mends(row, again=True)
        elif isinstance(message, Failed):
            self.notices.say("worker", message.says, kind="fault")

    def _say_doing(self, what: str) -> None:
        if what and not self._last_wrong:
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
        self._say_wrong(self.pane.place[0])
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
            # At its instant the next move begins; the knot is the end of the move before.
            self.crew.ask("source", (self.strand.fiber, nextafter(seconds, 0.0)), self._go_to_source)

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

    def _find_mends(self, row: Row, again: bool = False) -> None:
        checked = self.showing.known.checked
        if checked is None or row.snag >= len(checked.check.snags):
            return
        self._mends_early = self.showing.known.retimed is None
        if not again:
            self.snags.mends.say("Looking for what would mend it …")

        def show(mended: Any) -> None:
            if self.snags.current is not None and self.snags.current.snag == row.snag:
                chosen = any(button.hasFocus() for button in self.snags.mends.buttons)
                self.snags.mends.show_mended(mended)
                if chosen:
                    self.snags.to_choices()

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
        written = None if loop is None else (warp.was(loop[0]), warp.was(loop[1]))
        self.retimed.set_passage(written)
        self.stage.cloth.set_passage(written)


def retiming_in_words(count: int) -> str:
    """How many hits a retiming moves, as its list is called."""
    return f"Retiming, {count} hit{'s' * (count != 1)}" if count else "Retiming"


def _says(fault: Any) -> str:
    """What is wrong, what to do, what could have stood there: the first is never cut off where there is little room."""
    hint = f": {fault.hint}" if fault.hint else ""
    expected = f"; expected {fault.expected}" if fault.expected else ""
    return f"{fault.found}{hint}{expected}"
