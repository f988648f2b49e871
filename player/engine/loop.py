"""The engine: once a tick from the score's place to sets on their way, ahead of their due time, and back with what boards tell.

A set's due time follows from its tick's number, never from when the loop woke, so the host's jitter ends here. The engine
knows no terminal and no command line: it is given a source, outputs and a clock, and yields a snapshot a tick.
"""

from collections.abc import Callable, Iterator, Sequence
from typing import Any

import numpy as np

from composer.limits.abilities import Abilities, abilities_of
from composer.rig.model import Rig
from player.engine.account import Account
from player.engine.alarms import ALARMS, REST_ALL, REST_FIBER, VENT, Raised
from player.engine.asked import AT_ONCE, ENDS, LEFT_SAID, Asked, Command
from player.engine.boards import Boards
from player.engine.bringing_back import STAND_BY_SAID, BringingBack
from player.engine.clock import Clock
from player.engine.diary import Diary
from player.engine.quiet import no_collecting
from player.engine.run_log import RunLog
from player.engine.safety import Refused, Safety, after
from player.engine.sensing import Sensing
from player.engine.settling import SLICE_S, Settling
from player.engine.source import Source
from player.engine.status import Ending, Lateness, Status, status_of
from player.engine.verdicts import ARMED, RUNNING, verdict
from player.engine.ways import safe_ways
from player.outputs.base import Event, Mark, Output

AHEAD_S = 0.06
"""Sets are sent this long before they are due, less where a board's queue is short: a host may stall so long unseen."""

QUEUE_SHARE = 0.75
"""The part of a board's queue that sets ahead of their time may fill."""

STILL = 1e-7
"""A fiber that moves less than this strain in a tick stands still."""


class Engine:
    """One run, from pre-flight to the end. `ask` may be called from a signal's handler or another thread at any moment.

    returns: whether somebody is there who can have everything brought back after a fault; else a fault ends the run
    listen: called every few milliseconds at most, so that what front ends ask is heard at once
    returns_from: after which endings, beside a fault, everything can be brought back: none, but a hand plays on after a rest
    """

    def __init__(
        self,
        rig: Rig,
        source: Source,
        outputs: Sequence[Output],
        clock: Clock,
        rate_Hz: float = 200.0,
        ahead_s: float = AHEAD_S,
        abilities: Abilities | None = None,
        trims: bool = False,
    ):
        """`abilities` of the rig, where they are known already; `trims`: set-points are corrected by what is sensed."""
        self.source, self.rate_Hz, self.ahead_s = source, rate_Hz, ahead_s
        self.returns = False
        self.listen: Callable[[], None] = lambda: None
        self.returns_from: tuple[str, ...] = ("fault",)
        self.stand_by_said = STAND_BY_SAID
        self._leaving = False
        self.safety = Safety()
        self.lateness = Lateness()
        self.boards = Boards(outputs)
        self.clock = clock
        self._dt = 1.0 / rate_Hz
        self._asked = Asked()
        self._account = Account()
        self._due_s = clock.now()
        self._moving = 0
        drives = [fiber.mounting.valve.drive for fiber in rig.fibers]
        abilities = abilities or abilities_of(rig)
        self.sensing = Sensing(rig, abilities, trims)
        at_rest = np.zeros_like(abilities.stroke)
        self._falls_s = safe_ways(abilities, abilities.stroke, at_rest).longest_s
        self._settling = Settling(
            self.boards,
            self.sensing,
            clock,
            self._asked,
            state=lambda: self.safety.state,
            tend=self.tend,
            hear=self._hear,
            fault=self._fault,
            stop=self._stop,
            become=self._become,
        )
        self._diary = Diary(clock, abilities.stroke, drives, [driver.name for driver in rig.drivers])

    def ask(self, kind: str, value: float = 0.0) -> None:
        """Hand the engine something the operator wants; it is done at the next tick, or within a few milliseconds."""
        self._asked.put(kind, value)

    def keep_log(self, log: RunLog | None, say_place: Callable[[float], str] | None = None) -> None:
        """From here on all that happens goes into this log, each with its place in the score as `say_place` has it."""
        self._diary.keep(log, say_place)

    def preflight(self) -> tuple[Mark, ...]:
        """Every board asked what must be true before arming; with all marks good the engine may be armed."""
        marks = tuple(mark for output in self.boards.outputs for mark in output.preflight(self.rate_Hz))
        queues = [output.queue_sets for output in self.boards.outputs if output.queue_sets]
        if queues:
            self.ahead_s = min(self.ahead_s, QUEUE_SHARE * min(queues) * self._dt)
        self.ahead_s = max(self.ahead_s, 2.0 * self._dt)
        if all(mark.ok for mark in marks):
            self._become("preflight")
        return marks

    def arm(self) -> None:
        """Arm every board. Raises Refused without a fresh pre-flight."""
        self._become("arm")

    def vent(self) -> None:
        """Vent every board, whatever the state; while a run is on, ask for it instead."""
        self._stop("vented", "vented by the operator", "vent")

    def tend(self) -> None:
        """Keep the links alive while nothing is played: boards and front ends are heard, and boards hear from the player."""
        self.listen()
        self._hear(self.boards.poll())

    def run(self, from_s: float = 0.0) -> Iterator[Status]:
        """Play from a place of the score until all is at rest, or vented; a snapshot after every tick.

        However the caller leaves off, by an exception too, the fibers are vented if they are not at rest.
        """
        began = self.clock.now()
        try:
            self._obey()
            if self.safety.state == "armed":
                self._become("play", lambda: self.source.start(from_s))
                with no_collecting():
                    yield from self._ticks()
                    while self._may_return():
                        yield from self._stand_by()
                        if self.safety.state != "armed":
                            break
                        self._become("play", lambda: self.source.start(self.source.position_s))
                        yield from self._ticks()
        finally:
            if self.safety.state not in ("idle", "vented"):
                self._stop("fault", "the player broke off", "vent")
            self._end(began)

    def close(self) -> None:
        """Let go of every output; whatever is armed still is vented first. Harmless when called twice."""
        if self.safety.state not in ("idle", "vented"):
            self._become("vent")
        for event in self.boards.close():
            self._fault(event.driver, f"{event.driver}: {event.say}", "note")

    def _ticks(self) -> Iterator[Status]:
        start = self.clock.now() + self.ahead_s + self._dt
        tick = 0
        while self.safety.state in ("playing", "paused", "resting"):
            due = start + tick * self._dt
            late = self._wait(due - self.ahead_s) - (due - self.ahead_s)
            if late > self.ahead_s + self._dt:
                # All that was ahead is used up. To catch up would be a leap; the score goes on later instead.
                start, due = start + late, due + late
                self._slip(late)
            self.lateness.count(late, self._dt, self.ahead_s)
            self._obey()
            if self.safety.state not in ("playing", "paused", "resting"):
                break
            was = self.source.strain
            happened = self.source.tick(self._dt)
            # What has just been worked out leaves before anything else is done: a hand waits for it.
            self._send(due, late)
            if self.source.strain is not None and was is not None:
                self._moving = int(np.count_nonzero(np.abs(self.source.strain - was) > STILL))
                self.sensing.errors.want(due + self.source.lead_s + self._dt, self.source.strain, self.source.position_s)
            self._happen(happened)
            self._hear(self.boards.poll())
            tick += 1
            yield self.status(late)

    def _may_return(self) -> bool:
        return self.returns and not self._leaving and self._account.how in self.returns_from and self.source.resumes

    def note(self, kind: str, **told: Any) -> None:
        """A record of the source's own in the run's log, where one is kept."""
        self._diary.tell(kind, self.source.position_s, **told)

    def tell(self, say: str) -> None:
        """Something for the operator to hear, with the next snapshot."""
        self._account.tell(say)

    def _stand_by(self) -> Iterator[Status]:
        """After a fault, all at rest or vented: wait until the operator has had everything brought back, or ends the run."""
        self._account.tell(self.stand_by_said)
        bringing = BringingBack(
            self.boards, self.source, self.sensing, self.clock, self.tell, self.tend, self.preflight, self.arm, self.vent
        )
        # What was lost falls by its own weight; until it can be down, nothing sets out.
        down_s = self.clock.now() + self._falls_s
        for _ in bringing.waits(down_s, self._asked_now, lambda: self.returns, self.returns_from):
            yield self.status()

    def _send(self, due: float, late: float) -> None:
        self._due_s = due
        command = self.sensing.applied(self.source.command, self.source.strain)
        self._hear(self.boards.send(due, command))
        self._diary.set(due, late, self.source.position_s, command, self.source.strain)

    def _slip(self, late: float) -> None:
        self.lateness.slips += 1
        self.lateness.slipped_s += late
        self._account.tell(f"the host stood still for {late:.3f} s; the score goes on that much later")
        self._diary.tell("slip", self.source.position_s, seconds=late)

    def _wait(self, moment: float) -> float:
        """Wait until that moment, but do at once what cannot wait."""
        while True:
            self.listen()
            if self._asked.has(AT_ONCE):
                self._obey()
                if self.safety.state == "vented":
                    return max(moment, self.clock.now())
            now = self.clock.now()
            if moment - now <= SLICE_S:
                return self.clock.wait_until(moment)
            self.clock.wait_until(now + SLICE_S)

    def _obey(self) -> None:
        """Do what has been asked, in order; a vent before all else."""
        for command in sorted(self._asked_now(), key=lambda command: command.kind != "vent"):
            try:
                self._do(command)
            except Refused as refused:
                self._account.tell(str(refused))

    def _asked_now(self) -> list[Command]:
        """What has been asked since the last time, each of it logged."""
        asked = self._asked.take()
        for command in asked:
            self._diary.tell("command", self.source.position_s, command=command.kind, value=command.value)
        return asked

    def _do(self, command: Command) -> None:
        kind = command.kind
        if kind in ENDS:
            self._leaving = True
        if kind == "left":
            if self.safety.state in ("armed", "playing", "paused"):
                self._stop("stopped", LEFT_SAID, "rest")
            return
        if kind == "stop":
            kind = "vent" if self.safety.state == "resting" else "rest"
        if kind == "next_cue":
            if self.source.next_cue is None:
                raise Refused("there is no further cue")
            self.source.jump(self.source.next_cue.at_s)
        elif kind == "jump":
            self.source.jump(command.value)
        elif kind == "rest":
            self._stop("stopped", "stopped by the operator", "rest")
        elif kind == "vent":
            self._stop("vented", "vented by the operator", "vent")
        else:
            self._become(kind)

    def _happen(self, happened: str) -> None:
        """What the source came to in this tick."""
        if happened == "wait" and self.source.waiting is not None:
            self._become("wait")
            self._account.tell(f'waiting at cue "{self.source.waiting.name}"')
        elif happened == "end":
            self._stop("end", "the score came to its end", "end")
        elif happened == "at_rest" or (self.safety.state == "resting" and not self.boards.moves):
            self._become("at_rest")

    def _hear(self, events: Sequence[Event]) -> None:
        """What boards told; a fault of one may end the run for all."""
        for event in events:
            self._diary.event(event, self.source.position_s)
            if event.kind in ("sense", "supply"):
                for alarm, driver, say in self.sensing.sense(event, watched=self.safety.state in RUNNING):
                    self._alarm(alarm, driver, say)
                continue
            means, say = verdict(event, self.safety.state)
            if means == "tell":
                self._account.tell(say)
            elif means:
                self._fault(event.driver, say, means)

    def _alarm(self, alarm: Raised, driver: str, say: str) -> None:
        """What sensed strain or supply shows to be wrong, and what the table of alarms has done about it."""
        does = ALARMS[alarm.name].does
        self._diary.tell("alarm", self.source.position_s, alarm=alarm.name, fiber=alarm.fiber, does=does, say=say)
        if does == REST_FIBER:
            self.source.set_down(alarm.fiber)
            say += "; it is brought to rest, and the run goes on without it"
        self._fault(driver, say, {REST_ALL: "fault", VENT: "vent"}.get(does, "note"))

    def _fault(self, driver: str, say: str, means: str) -> None:
        """Keep a fault for the report, tell it, and do what it means for the run."""
        self._account.fault(self.source.position_s, driver, say)
        if means != "note" and self.safety.state in ARMED:
            self._stop("fault", say, means)

    def _stop(self, how: str, why: str, event: str) -> None:
        """End the run by that event, for that reason. Raises Refused before anything is done."""
        after(self.safety, event)
        self._account.ends(how, why, ending=self.safety.state in ("resting", "vented", "idle"))
        self._become(event)

    def _become(self, event: str, start: Callable[[], None] | None = None) -> None:
        """The transition of an event, and all that it must do."""
        was = self.safety.state
        self.safety, must = after(self.safety, event)
        deeds = {
            "arm": lambda: self._hear(self.boards.arm()),
            "start": start or self.source.start,
            "hold": self.source.pause,
            "resume": self.source.go_on,
            "let_down": self._let_down,
            "disarm": lambda: self._settling.disarm(self._due_s + self.source.lead_s + self._dt),
            "vent": self._settling.vent,
        }
        self._diary.tell("state", self.source.position_s, was=was, event=event, state=self.safety.state)
        for deed in must:
            deeds[deed]()

    def _let_down(self) -> None:
        self.source.rest()
        if self.source.phase == "at rest":
            self._become("at_rest")

    def status(self, late_s: float = 0.0) -> Status:
        """A snapshot; what was new to tell is told once."""
        moving = self._moving if self.safety.state in ("playing", "paused", "resting") else 0
        return status_of(self.safety.state, self.source, self.boards.links, self.lateness, moving, late_s, self._account.news())

    def _end(self, began: float) -> None:
        if self._diary.broken:
            self._fault("", f"the log could not be written to its end: {self._diary.broken}", "note")
        self._account.lasted_s = self.clock.now() - began

    @property
    def ending(self) -> Ending:
        """How the run ended; whole once it has been closed."""
        return self._account.ending(self.safety.state, self.source.position_s)
