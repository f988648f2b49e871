"""What OSC messages mean: fixed addresses and the binds of a map into events, at their time. No socket and no clock in here.

Whatever is wrong changes nothing and is counted by its reason. There is no address that arms, and none that could.
"""

import heapq
import math
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field

from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.model import Score
from composer.score.names import groups_of
from player.inputs.beat import Beat
from player.inputs.events import Ask, Back, Begin, End, Event, Silent, Wanted
from player.inputs.model import Bind, Does, Map, Play, Stroke
from player.inputs.osc_packets import REFUSED, OscMessage, Refused, read_packet, seconds_ahead

SOURCE = "osc"
PACKETS_A_S = 2000.0
BURST = 500.0
"""Packets that may come at once after a pause; from then on PACKETS_A_S."""

FARTHEST_S = 60.0
MOST_WAITING = 4096

FIBER, GROUP, PHRASE = "/drawcord/fiber/", "/drawcord/group/", "/drawcord/phrase/"
CUE = "/drawcord/cue"
ASKS = {f"/drawcord/{what}": what for what in ("pause", "go_on", "rest", "vent")}
STOPS = ("/drawcord/rest", "/drawcord/vent")
URGENT = tuple(f"{address}\0".encode() for address in STOPS)
"""Packets that begin so are taken however many others come: nobody's flood keeps anyone from stopping."""

ADDRESSES = {
    "/drawcord/fiber/NAME": ("f", "the stroke wanted of a fiber, a share from 0 to 1"),
    "/drawcord/group/NAME": ("f", "the stroke wanted of a group"),
    "/drawcord/phrase/NAME": (
        "f, or nothing",
        "the phrase begins, its targets times the velocity, 0 to 1; 1 where there is none",
    ),
    "/drawcord/cue": ("s", "jump to the cue of that name"),
    "/drawcord/pause": ("", "the score stands still"),
    "/drawcord/go_on": ("", "it goes on"),
    "/drawcord/rest": ("", "all fibers come to rest"),
    "/drawcord/vent": ("", "every valve exhausts, at once"),
}
"""The fixed addresses: their arguments, and what they do."""


@dataclass(frozen=True, slots=True)
class Known:
    """What names may stand in addresses, with the fibers of each: fibers, groups, phrases; and the cues there are.

    Only whole names: to look for what a misspelt one may have meant would give strangers a way to keep the player busy.
    """

    fibers: Mapping[str, int]
    groups: Mapping[str, tuple[int, ...]] = field(default_factory=dict)
    phrases: Mapping[str, tuple[int, ...]] = field(default_factory=dict)
    cues: Collection[str] = ()


def known_of(rig: Rig, score: Score | None = None) -> Known:
    """The names of a rig and of a score that has been checked on it; a phrase is played by all fibers that ever do."""
    fibers = {fiber.name: index for index, fiber in enumerate(rig.fibers)}
    if score is None:
        return Known(fibers, dict(rig.groups))
    selector = Selector(rig, groups_of(score))
    groups = dict(rig.groups) | {name: selector.resolve(name) for name in score.groups}
    players: dict[str, set[int]] = {name: set() for name in score.phrases}
    for section in score.sections:
        for entry in section.entries:
            chosen = [index for name in entry.fibers for index in selector.resolve(name.text)]
            partners = (rig.fibers[index].mirror for index in chosen) if entry.mirror else chosen
            players[entry.phrase.text].update(index for index in partners if index is not None)
    phrases = {name: tuple(sorted(found)) for name, found in players.items() if found}
    return Known(fibers, groups, phrases, tuple(cue.name for cue in score.cues))


class OscBinds:
    """Packets in, events out. `refused` counts by the names of `REFUSED`; `taken` counts messages that meant something.

    beat: the running tempo for quantised starts; None: they start at once
    """

    def __init__(self, map_: Map, known: Known):
        self.beat: Beat | None = None
        self.refused = dict.fromkeys(REFUSED, 0)
        self.taken = 0
        self._map = map_
        self._known = known
        self._binds: dict[str, list[tuple[int, Bind]]] = {}
        for index, bind in enumerate(map_.binds):
            if bind.osc:
                self._binds.setdefault(bind.osc, []).append((index, bind))
        self._waiting: list[tuple[float, int, Event]] = []
        self._serial = 0
        self._tokens, self._refilled_s = BURST, -math.inf
        self._held: dict[int, tuple[tuple[object, ...], Play]] = {}
        self._driven: set[int] = set()
        self._heard_s: float | None = None
        self._silent = False

    def hear(self, data: bytes, now_s: float, unix_s: float) -> list[Event]:
        """The events of a packet that are due now; what is for later comes from `tick`.

        unix_s: the time of day, seconds since 1970, which time tags count by
        """
        if not data.startswith(URGENT) and not self._may_pass(now_s):
            self.refused["fast"] += 1
            return []
        try:
            messages = read_packet(data)
        except Refused as refused:
            self.refused[refused.why] += 1
            return []
        due: list[Event] = []
        for message in messages:
            try:
                self._take(due, message, now_s, seconds_ahead(message.tag, unix_s))
            except Refused as refused:
                self.refused[refused.why] += 1
        return due

    def tick(self, now_s: float) -> list[Event]:
        """What time tags put off until now, and what follows from silence."""
        due: list[Event] = []
        while self._waiting and self._waiting[0][0] <= now_s:
            due.append(heapq.heappop(self._waiting)[2])
        silence_s = self._map.silence_s
        if self._heard_s is not None and not self._silent and 0.0 < silence_s < now_s - self._heard_s:
            self._silent = True
            why = f"osc: nothing came for {now_s - self._heard_s:.1f} s"
            due += [End(SOURCE, now_s, name, play.fibers, play.rest) for name, play in self._held.values()]
            due.append(Silent(SOURCE, now_s, tuple(sorted(self._driven)), why))
            self._held.clear()
            self._driven.clear()
        return due

    def let_go(self, fibers: Collection[int]) -> None:
        """Something else moves these fibers now: silence here is not theirs any more."""
        self._driven.difference_update(fibers)

    @property
    def waiting(self) -> int:
        """How many events wait for their time."""
        return len(self._waiting)

    def _may_pass(self, now_s: float) -> bool:
        """A token bucket over packets."""
        self._tokens = min(BURST, self._tokens + PACKETS_A_S * max(0.0, now_s - self._refilled_s))
        self._refilled_s = max(now_s, self._refilled_s)
        if self._tokens < 1.0:
            return False
        self._tokens -= 1.0
        return True

    def _take(self, due: list[Event], message: OscMessage, now_s: float, ahead_s: float) -> None:
        far = ahead_s > FARTHEST_S
        full = ahead_s > 0.0 and len(self._waiting) + len(self._binds.get(message.address, "1")) * 2 > MOST_WAITING
        if message.address in STOPS and (far or full):
            # Whoever asks for a stop with a clock that is wrong gets it now.
            ahead_s, far, full = 0.0, False, False
        at_s = now_s + ahead_s
        if far or full:
            raise Refused("late" if far else "full")
        events = self._events(message, at_s)
        self.taken += 1
        self._heard_s = now_s
        if self._silent:
            self._silent = False
            due.append(Back(SOURCE, now_s))
        for event in events:
            if isinstance(event, Wanted | Begin):
                self._driven.update(event.fibers)
            if ahead_s > 0.0:
                self._serial += 1
                heapq.heappush(self._waiting, (at_s, self._serial, event))
            else:
                due.append(event)

    def _events(self, message: OscMessage, at_s: float) -> list[Event]:
        """What a message means. Raises `Refused`."""
        address = message.address
        if address in ASKS:
            _no_arguments(message)
            return [Ask(SOURCE, at_s, ASKS[address])]
        if address == CUE:
            if message.types != "s":
                raise Refused("type")
            if message.arguments[0] not in self._known.cues:
                raise Refused("name")
            return [Ask(SOURCE, at_s, "cue", str(message.arguments[0]))]
        if address.startswith(FIBER):
            index = self._known.fibers.get(address[len(FIBER) :])
            if index is None:
                raise Refused("name")
            return [Wanted(SOURCE, at_s, (index,), _share(message))]
        if address.startswith(GROUP):
            fibers = self._known.groups.get(address[len(GROUP) :])
            if fibers is None:
                raise Refused("name")
            return [Wanted(SOURCE, at_s, fibers, _share(message))]
        if address.startswith(PHRASE):
            return [self._phrase(address[len(PHRASE) :], message, at_s)]
        if address in self._binds:
            return [event for index, bind in self._binds[address] for event in self._bound(index, bind, message, at_s)]
        raise Refused("address")

    def _phrase(self, name: str, message: OscMessage, at_s: float) -> Event:
        fibers = self._known.phrases.get(name)
        if fibers is None:
            raise Refused("name")
        scale = _share(message) if message.types else 1.0
        self._serial += 1
        return Begin(SOURCE, at_s, name, fibers, scale, (SOURCE, name, self._serial))

    def _bound(self, index: int, bind: Bind, message: OscMessage, at_s: float) -> list[Event]:
        deed = bind.deed
        if isinstance(deed, Stroke):
            return [Wanted(SOURCE, at_s, deed.fibers, deed.stroke(_share(message)), deed.how, index)]
        value = _share(message) if message.types else 1.0
        if isinstance(deed, Does):
            return [Ask(SOURCE, at_s, deed.what)] if value >= 0.5 else []
        events: list[Event] = []
        held = self._held.pop(index, None)
        if held is not None:
            events.append(End(SOURCE, at_s, held[0], held[1].fibers, held[1].rest and value == 0.0))
        if value > 0.0:
            self._serial += 1
            name = (SOURCE, index, self._serial)
            self._held[index] = (name, deed)
            starts_s = at_s if deed.quantise is None or self.beat is None else self.beat.next_s(at_s, deed.quantise)
            events.append(Begin(SOURCE, starts_s, deed.phrase, deed.fibers, value, name, deed.how, index))
        return events


def _no_arguments(message: OscMessage) -> None:
    if message.types:
        raise Refused("type")


def _share(message: OscMessage) -> float:
    """The one float of a message, from 0 to 1. Raises `Refused`."""
    if message.types != "f":
        raise Refused("type")
    value = message.arguments[0]
    assert isinstance(value, float)
    if not 0.0 <= value <= 1.0:
        raise Refused("value")
    return value
