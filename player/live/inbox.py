"""Every input of a session together: MIDI ports and an OSC socket in, their events out; feedback and reports back to them."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from mido import Message
from numpy.typing import NDArray

from player.inputs.beat import Beat
from player.inputs.events import Ask as Asked
from player.inputs.events import Back, Begin, Event, HoldToRun, Silent, Timing, Wanted
from player.inputs.feedback import Feedback
from player.inputs.midi import MidiBinds
from player.inputs.midi_ports import MidiPorts
from player.inputs.model import Map
from player.inputs.osc import Known, OscBinds
from player.inputs.osc_port import OscPort

Array = NDArray[np.float64]

MOST_SOURCES = 64


@dataclass(frozen=True, slots=True)
class Seen:
    """A source as a screen shows it: the last that came of it, when, how much has come, and whether it is silent now."""

    name: str
    last: str = "nothing yet"
    at_s: float = float("-inf")
    count: int = 0
    silent: bool = False


@dataclass(frozen=True, slots=True)
class Input:
    """What came in, for logs and takes: where from, by which control, the value from 0 to 1."""

    source: str
    control: str
    value: float


class Inbox:
    """Inputs of a session; `poll` as `player.live.source.Inputs` has it.

    inputs: what the last poll brought, the latest of each control; seen: sources by name
    """

    def __init__(
        self, map_: Map, known: Known, fibers: Sequence[str], clock: Callable[[], float], unix: Callable[[], float],
        ports: MidiPorts | None = None, osc: OscPort | None = None,
    ):  # fmt: skip
        """clock, unix: the steady time and the time of day; ports and osc are closed by `close`."""
        self.ports, self.osc = ports, osc
        self.midi_binds, self.osc_binds = MidiBinds(map_, len(fibers)), OscBinds(map_, known)
        self.feedback = Feedback(map_)
        self.inputs: tuple[Input, ...] = ()
        self._map, self._names, self._known = map_, tuple(fibers), known
        self._clock, self._unix = clock, unix
        self._seen: dict[str, Seen] = {}
        self._groups = {tuple(sorted(of)): name for name, of in known.groups.items()}
        for source in ports.sources if ports is not None else ():
            self._seen[source] = Seen(source)
        if osc is not None:
            self._seen["osc"] = Seen("osc")

    def poll(self, now_s: float, present: Array, beat: Beat | None) -> Sequence[Event]:
        """What has come in since the last time, and what follows from silence."""
        events: list[Event] = []
        self.midi_binds.present, self.midi_binds.beat, self.osc_binds.beat = present, beat, beat
        if self.ports is not None:
            heard, changes = self.ports.poll()
            for change in changes:
                if change.kind == "lost":
                    found = self.midi_binds.lost(change.source, change.at_s, "the port is gone")
                    events += found
                else:
                    self.feedback.again()
                    events.append(Back(change.source, change.at_s))
                    self._put(replace(self._seen.get(change.source, Seen(change.source)), silent=False))
            for one in heard:
                events += self._heard(self.midi_binds.hear(one.source, one.message, one.at_s), self.osc_binds)
        events += self._heard(self.midi_binds.tick(now_s), self.osc_binds)
        if self.osc is not None:
            unix_s = self._unix()
            packets: list[Event] = []
            self.osc.poll(lambda data: packets.extend(self.osc_binds.hear(data, now_s, unix_s)))
            events += self._heard(packets, self.midi_binds)
            events += self._heard(self.osc_binds.tick(now_s), self.midi_binds)
        self._notice(events)
        return events

    def remap(self, map_: Map) -> None:
        """Go by another map from now on; whoever calls has all hands let go."""
        refused = self.osc_binds.refused
        self._map = map_
        self.midi_binds, self.osc_binds = MidiBinds(map_, len(self._names)), OscBinds(map_, self._known)
        self.osc_binds.refused = refused
        self.feedback = Feedback(map_)

    @property
    def seen(self) -> tuple[Seen, ...]:
        """Every source that is heard or has been, as it is now."""
        return tuple(self._seen.values())

    @property
    def refused(self) -> dict[str, int]:
        """What was refused of all inputs, by reason, counts above 0 alone."""
        counts: dict[str, int] = {}
        midi = self.ports.refused if self.ports is not None else {}
        for name, part in (("midi", midi), ("osc", self.osc_binds.refused)):
            counts |= {f"{name} {why}": count for why, count in part.items() if count}
        return counts

    def answer(self, now_s: float, share: Array, playing: frozenset[int]) -> None:
        """Motor faders and lights are sent what has been let through, (F,) shares of stroke."""
        if self.ports is None:
            return
        for port, message in self.feedback.messages(now_s, share, playing):
            self.ports.send(message, port)

    def send(self, message: Message, port: str) -> None:
        """A message to every port with that in its name."""
        if self.ports is not None:
            self.ports.send(message, port)

    def close(self) -> None:
        """Let go of ports and socket."""
        if self.ports is not None:
            self.ports.close()
        if self.osc is not None:
            self.osc.close()

    def _heard(self, events: list[Event], others: MidiBinds | OscBinds) -> list[Event]:
        """Fibers that one kind of input moves are no other's any more; a source is told of once when it is back."""
        events = [
            one for one in events if not isinstance(one, Back) or self._seen.get(one.source, Seen("", silent=True)).silent
        ]
        for event in events:
            if isinstance(event, Wanted | Begin):
                others.let_go(event.fibers)
            if isinstance(event, Wanted) and event.bind >= 0:
                self.feedback.heard(event.bind, event.at_s)
        return events

    def _notice(self, events: Sequence[Event]) -> None:
        latest: dict[tuple[str, str], Input] = {}
        for event in events:
            if isinstance(event, Timing):
                self._see(event.source, event.what, event.at_s)
                continue
            seen = self._seen.get(event.source, Seen(event.source))
            if isinstance(event, Silent):
                self._put(replace(seen, silent=True, last=event.why.removeprefix(f"{event.source}: ")))
                latest[event.source, "silent"] = Input(event.source, "silent", 0.0)
            elif isinstance(event, Back):
                self._put(replace(seen, silent=False, last="there again", at_s=event.at_s))
                latest[event.source, "back"] = Input(event.source, "back", 1.0)
            elif (said := self._said(event)) is not None:
                self._see(event.source, f"{said.control} {said.value:.2f}", event.at_s)
                latest[said.source, said.control] = said
        self.inputs = tuple(latest.values())

    def _said(self, event: Event) -> Input | None:
        if isinstance(event, Wanted):
            return Input(event.source, f"{self._control(event.bind)}{self._fibers(event.fibers)}", event.stroke)
        if isinstance(event, Begin):
            said = f"{self._control(event.bind)}{event.phrase} on {self._fibers(event.fibers)}"
            return Input(event.source, said, event.scale)
        if isinstance(event, Asked):
            return Input(event.source, f"{event.what} {event.name}".strip(), 1.0)
        if isinstance(event, HoldToRun):
            return Input(event.source, "hold_to_run", float(event.down))
        return None

    def _control(self, bind: int) -> str:
        if bind < 0:
            return ""
        row = self._map.binds[bind]
        if row.control is None:
            return f"{row.osc}: "
        number = f" {row.control.number}" if row.control.kind not in ("bend", "pressure") else ""
        return f"{row.control.kind}{number}: "

    def _fibers(self, fibers: tuple[int, ...]) -> str:
        if len(fibers) == 1:
            return self._names[fibers[0]]
        return self._groups.get(tuple(sorted(fibers))) or f"{self._names[fibers[0]]} and {len(fibers) - 1} more"

    def _see(self, source: str, last: str, at_s: float) -> None:
        seen = self._seen.get(source, Seen(source))
        self._put(replace(seen, last=last, at_s=at_s, count=seen.count + 1, silent=False))

    def _put(self, seen: Seen) -> None:
        if seen.name in self._seen or len(self._seen) < MOST_SOURCES:
            self._seen[seen.name] = seen
