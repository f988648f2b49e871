"""What rows of the table of actions do to what is seen and heard: a method `do_NAME` each."""

from typing import Any

from PySide6.QtWidgets import QApplication

from composer.editor.stage import CLOTH, HANG, RIG
from composer.edits.edit import Refusal


class Sights:
    """The actions of the menus View and Play, by the names of the table."""

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
