"""After a run that ended at rest or vented: waiting for the operator, and bringing everything back by their deed."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass

from player.engine.asked import ENDS, Command
from player.engine.boards import Boards
from player.engine.clock import Clock
from player.engine.sensing import Sensing
from player.engine.source import Source
from player.outputs.base import LinkLost, Mark

SENSES_S = 0.25
"""Before fibers are brought back from where they are, boards have so long to sense where that is."""

STAND_BY_S = 0.05
STAND_BY_SAID = "All is at rest or vented. Press b to bring everything back and go on from here, Ctrl-C to end the run."

LOOK_S = 0.005


@dataclass(frozen=True, slots=True, eq=False)
class BringingBack:
    """What is needed of an engine: its parts, and some of its deeds; `tend` hears boards and front ends."""

    boards: Boards
    source: Source
    sensing: Sensing
    clock: Clock
    tell: Callable[[str], None]
    tend: Callable[[], None]
    preflight: Callable[[], tuple[Mark, ...]]
    arm: Callable[[], None]
    vent: Callable[[], None]

    def waits(
        self, down_s: float, asked: Callable[[], list[Command]], returns: Callable[[], bool], returns_from: tuple[str, ...]
    ) -> Iterator[None]:
        """Wait for the operator, giving way now and again; ends once all is armed again, or is not to be brought back.

        down_s: as `done` has it; asked: what has been asked since the last time; returns: whether somebody is there who could
        returns_from: after which endings things are brought back, as the engine has it
        """
        while returns():
            self.clock.wait_until(self.clock.now() + STAND_BY_S)
            self.tend()
            kinds = [command.kind for command in asked()]
            if not ENDS.isdisjoint(kinds) or ("rest" in kinds and "stopped" not in returns_from):
                return
            if "vent" in kinds:
                self.vent()
                if "vented" not in returns_from:
                    return
            if "bring_back" in kinds and self.done(down_s):
                return
            yield

    def done(self, down_s: float) -> bool:
        """Find lost boards, go through the pre-flight, and arm; whether all of it went well. What did not is told.

        down_s: before this moment what was lost may still be on its way down by its own weight, and nothing sets out
        """
        found, missing = self.boards.reattach()
        for say in found + missing:
            self.tell(say)
        if missing:
            return False
        self.clock.wait_until(down_s)
        self.sensing.begin_again()
        try:
            wrong = [mark for mark in self.preflight() if not mark.ok]
            for mark in wrong:
                self.tell(f"not so: {mark.asked}: {mark.found}; {mark.hint}")
            if wrong:
                return False
            # What boards sensed before they were lost is long over: only what they sense now counts.
            until = self.clock.now() + SENSES_S
            while self.clock.now() < until:
                self.clock.wait_until(self.clock.now() + LOOK_S)
                self.tend()
            self.source.found(self.sensing.last.copy())
            self.arm()
        except LinkLost as lost:
            self.tell(f"lost again: {lost}")
            return False
        return True
