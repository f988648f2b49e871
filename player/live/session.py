"""A live session: the source and the engine under it, tick by tick, with screen, take, clock and reports beside them."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from player.engine.loop import Engine
from player.engine.status import Status
from player.governor.causes import CAUSES, NONE
from player.inputs.model import Does, Map, Play
from player.inputs.osc_out import OscOut
from player.live.clock_out import ClockOut
from player.live.inbox import Inbox
from player.live.source import KEYBOARD, Live
from player.live.takes import Takes

CUTS_S = 0.1
"""How often the log is told at most what the governor cuts."""

LIVELY = ("playing", "paused", "resting")


@dataclass(slots=True)
class Session:
    """All parts of a session; `after` is called with every snapshot of the engine.

    send_osc: where reports go, if they are asked for; names: of the fibers; title: as the screen has it
    """

    engine: Engine
    live: Live
    inbox: Inbox
    now: Callable[[], float]
    say_place: Callable[[float], str]
    names: tuple[str, ...]
    stroke: np.ndarray
    title: str
    takes: Takes | None = None
    clock_out: ClockOut | None = None
    send_osc: Callable[[bytes], None] | None = None
    osc_out: OscOut = field(default_factory=OscOut)
    cuts_seen: np.ndarray | None = None
    cuts_s: float = float("-inf")
    inputs_seen: int = 0

    def after(self, status: Status) -> None:
        """All that follows from a tick, or from a moment in which nothing is played."""
        if status.state not in LIVELY:
            self.live.idle()
        view, now = self.live.view, self.now()
        playing = status.state in LIVELY
        if self.takes is not None:
            self.takes.tick(status.position_s, playing and self.live.records, view.wanted, view.allowed)
        for one in self.inbox.inputs:
            self.inputs_seen += 1
            self.engine.note("input", source=one.source, what=one.control, value=round(one.value, 6))
            if self.takes is not None:
                self.takes.input(status.position_s, one.source, one.control, one.value)
        self.inbox.inputs = ()
        self.inbox.answer(now, view.allowed / self.stroke, view.binds_playing)
        if self.clock_out is not None:
            self.clock_out.go(self.live.beat if playing else None)
        if now - self.cuts_s >= CUTS_S and (self.cuts_seen is None or not np.array_equal(view.cut, self.cuts_seen)):
            self.cuts_seen, self.cuts_s = view.cut, now
            self._log_cuts(view.cut, view.by)
        if self.send_osc is not None:
            cue = (self.live.cue.name, self.live.cue.at_s) if self.live.cue is not None else None
            for packet in self.osc_out.packets(
                now, status.state, status.position_s, view.counts_a_minute, cue, self._cuts(view.cut, view.by)
            ):
                self.send_osc(packet)

    def asked(self, what: str) -> None:
        """What a key asked for: of the source here, of the engine there."""
        if what in ("hold", "held"):
            self.live.hold(KEYBOARD, what == "hold")
        elif what == "let_go":
            self.live.let_go()
            self.engine.tell("all hands have let go: the score, or rest, has every fiber again")
        elif what == "record":
            if self.takes is None:
                self.engine.tell("nothing is recorded without --take OUT.score")
            else:
                self.takes.turn()
        elif what == "bring_back" and self.engine.safety.state in LIVELY:
            self.engine.tell("it is armed already")
        else:
            self.engine.ask(what)

    def remap(self, before: Map, after: Map) -> str:
        """Go by another map: why not, "" where it is gone by. Fibers of all hands go back to the score, or to rest."""
        if _held(before) != _held(after):
            return "what is held to run is another control in it: it counts from the next beginning on"
        if not _phrases(after) <= _phrases(before):
            return "it has phrases that are not made ready: it counts from the next beginning on"
        self.live.let_go()
        self.inbox.remap(after)
        return ""

    @property
    def take_says(self) -> str:
        """What the take says of itself, "" where none is recorded."""
        return self.takes.says if self.takes is not None else ""

    def _cuts(self, cut: np.ndarray, by: np.ndarray) -> tuple[tuple[str, str, float], ...]:
        which = np.flatnonzero(cut != NONE)
        return tuple((CAUSES[cut[f]].kind, self.names[f], min(1.0, abs(float(by[f] / self.stroke[f])))) for f in which)

    def _log_cuts(self, cut: np.ndarray, by: np.ndarray) -> None:
        for cause in np.unique(cut[cut != NONE]):
            which = np.flatnonzero(cut == cause)
            worst = float(np.max(np.abs(np.nan_to_num(by[which], posinf=9.0, neginf=-9.0))))
            self.engine.note("cut", why=CAUSES[cause].kind, fibers=which.tolist(), by=round(worst, 6))


def _held(map_: Map) -> list[str]:
    return [str(bind.control) for bind in map_.binds if isinstance(bind.deed, Does) and bind.deed.what == "hold_to_run"]


def _phrases(map_: Map) -> set[tuple[str, tuple[int, ...]]]:
    return {(bind.deed.phrase, bind.deed.fibers) for bind in map_.binds if isinstance(bind.deed, Play)}
