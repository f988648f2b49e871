"""A run between its engine and its front ends: what they ask is done, what it does is shown, and nobody is waited for.

opened ─ preflight ─ wait_for_arm ─ (arm) ─ wait_for_play ─ engine.run, `after` each snapshot
"""

from collections.abc import Callable, Sequence
from typing import Any

from player.engine.loop import Engine
from player.engine.process.door import Door
from player.engine.process.show import Show
from player.engine.status import Status
from player.outputs.base import LinkLost, Mark

WAIT_S = 0.005
HOLD_S = 0.5
"""A hold-to-run that is not said anew within this time is up: whoever held it may be stopped, or gone."""

INPUTS_S = 0.1
QUIET_S = 0.3
"""A run that is busy with something other than ticks, boards that are waited for among it, shows itself so often."""


class Conduct:
    """One for a run.

    asked: what is handed everything that is asked while the run is on; the engine's own `ask` for a score alone
    can_return: whether a front end with keys is offered to have everything brought back after a fault
    view, inputs: what a hand wants and gets, and what its sources say, where a hand plays
    remap: reads the map file anew, where a hand plays by one; returns why it is not gone by, "" where it is
    """

    def __init__(self, engine: Engine, door: Door, show: Show, asked: Callable[[str], None] | None = None):
        self._engine, self._door, self._show = engine, door, show
        self._asked = asked
        self.can_return = True
        self.view: Callable[[], Any] | None = None
        self.inputs: Callable[[], dict[str, Any]] | None = None
        self.remap: Callable[[], str] = lambda: "nothing is played by hand here"
        self._stage = "opened"
        self._wants: set[str] = set()
        self._from_s = 0.0
        self._held_until_s: float | None = None
        self._shown_s = float("-inf")
        self._inputs_s, self._inputs_told = float("-inf"), {}
        door.take, door.left = self._take, self._left
        door.state = lambda: engine.safety.state
        door.note = lambda **told: engine.note("front", **told)
        engine.listen = self.listen

    def listen(self) -> None:
        """Hear the front ends; called every few milliseconds."""
        self._door.serve()
        self._engine.returns = self.can_return and self._door.answers
        if self._held_until_s is not None and self._engine.clock.now() > self._held_until_s:
            self._hold(False)
        if self._stage == "running" and self._engine.clock.now() - self._shown_s > QUIET_S:
            self.after(self._engine.status())

    def preflight(self) -> bool:
        """Go through the pre-flight and tell its marks; whether all are good."""
        marks: Sequence[Mark]
        try:
            marks = self._engine.preflight()
        except LinkLost as lost:
            marks = (Mark("the line holds", False, str(lost), "is it plugged in, and has it power?"),)
        ok = all(mark.ok for mark in marks)
        rows = [{"asked": one.asked, "ok": one.ok, "found": one.found, "hint": one.hint} for one in marks]
        must_arm = any(output.must_arm for output in self._engine.boards.outputs)
        self._stage = "preflight"
        self._door.say("marks", ok=ok, must_arm=must_arm, marks=rows)
        return ok

    def wait_for_arm(self) -> bool:
        """Until a front end arms, going through the pre-flight again where it asks; False where it leaves it, or is gone."""
        while True:
            self._idle()
            if "vent" in self._wants:
                self._engine.vent()
                return False
            if "end" in self._wants or not self._door.commanded:
                return False
            if "preflight" in self._wants:
                self._wants.discard("preflight")
                self.preflight()
            if "arm" in self._wants and self._engine.safety.checked:
                self._stage = "arming"
                return True
            self._wants &= {"play"}

    def wait_for_play(self) -> float:
        """Armed, until a front end plays, or something ends it; the place in s from which."""
        self._stage = "armed"
        self._engine.note("front", what="commands", say=f"when left: {self._door.rule}", attached=self._door.attached)
        while "play" not in self._wants and not self._wants & {"vent", "rest", "stop", "left"}:
            self._idle()
            if self._engine.safety.state != "armed":
                break
        self._stage = "running"
        return self._from_s

    def after(self, status: Status) -> None:
        """Show and tell a snapshot."""
        self._shown_s = self._engine.clock.now()
        view = self.view() if self.view is not None else None
        self._door.tell(status.told)
        self._show.tick(status, view, self._door.commanded, self._door.attached)
        if self.inputs is not None:
            now = self._engine.clock.now()
            if now - self._inputs_s >= INPUTS_S:
                self._inputs_s = now
                told = self.inputs()
                if told != self._inputs_told:
                    self._inputs_told = told
                    self._door.say("inputs", **told)

    def _idle(self) -> None:
        clock = self._engine.clock
        clock.wait_until(clock.now() + WAIT_S)
        self._engine.tend()
        self.after(self._engine.status())

    def _take(self, name: str, fields: dict[str, Any]) -> str:
        """What a front end asks, once the table has let it through; why it is not done, "" where it is."""
        if name in ("preflight", "arm"):
            if self._stage not in ("opened", "preflight"):
                return f"'{name}' comes before the run; bring_back is what arms again"
            if name == "arm" and not self._engine.safety.checked:
                return "'arm' needs a pre-flight first in which all is in order"
            self._wants.add(name)
        elif name == "play":
            if self._stage == "running" or (self._stage != "armed" and not self._engine.safety.checked):
                return "'play' comes after a pre-flight and arming, once a run"
            self._from_s = fields["from_s"]
            self._wants.add("play")
        elif name == "map":
            return self.remap()
        elif self._stage in ("opened", "preflight"):
            if name in ("stop", "rest"):
                self._wants.add("end")
            elif name == "vent":
                self._wants.add("vent")
            else:
                return f"'{name}' comes after arming"
        elif name == "bring_back" and self._stage != "running":
            return "it is armed already"
        elif name == "hold":
            self._hold(fields["down"])
        else:
            self._wants.add(name)
            self._ask(name, fields)
        return ""

    def _ask(self, name: str, fields: dict[str, Any]) -> None:
        if name == "jump":
            self._engine.ask("jump", fields["to_s"])
        elif self._asked is not None:
            self._asked(name)
        else:
            self._engine.ask(name)

    def _hold(self, down: bool) -> None:
        was, self._held_until_s = self._held_until_s, self._engine.clock.now() + HOLD_S if down else None
        if self._asked is not None and (was is None) == down:
            self._asked("hold" if down else "held")

    def _left(self) -> None:
        """The front end that commanded is gone: the rule says what becomes of the run."""
        if self._held_until_s is not None:
            self._hold(False)
        if self._stage in ("opened", "preflight"):
            self._wants.add("end")
        elif self._door.rule == "rest" or self._engine.safety.state not in ("playing", "paused"):
            self._wants.add("left")
            self._engine.ask("left")
        else:
            self._engine.tell("the front end that commanded is gone; the run goes on, and can be attached to")
