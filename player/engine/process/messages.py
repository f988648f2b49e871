"""What front ends and a run say to each other over the local socket: one table, and its reading. No I/O.

A message is one line of JSON, {"say": NAME, FIELD: VALUE, ...}, ended by a newline. Reader, engine, clients and tests read this
table; what is not in it, has other fields, or comes in a state or from one for which its row has no place, changes nothing and
is answered with `refused`.
"""

import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from player.engine.safety import STATES

VERSION = 1
LONGEST_ASKED = 4096
"""Bytes of a message to the engine."""

LONGEST_TOLD = 8 << 20
"""Bytes of a message to a front end: the names of 4096 fibers, or a report with all its faults, many times over."""

ANY = tuple(STATES)
MOVING = ("playing", "paused")
DISARMED = ("idle", "vented")
RULES = {
    "rest": "all come to rest at their safe rate, the boards disarmed",
    "go-on": "the run goes on to its end",
}
"""What a run does when the front end that commands it is gone."""


@dataclass(frozen=True, slots=True)
class Message:
    """A row of the table.

    fields: name of each field, and its kind: "flag", "seconds" (finite, 0 or more), "rule" (of RULES), "number", "text",
        "list", "object"
    who: "any" front end that is attached, or the one that "commands"
    states: the states of player.engine.safety in which it is taken
    """

    name: str
    about: str
    fields: Mapping[str, str] = ()  # type: ignore[assignment]
    who: str = "commands"
    states: tuple[str, ...] = ANY


ASKED = {
    row.name: row
    for row in (
        Message(
            "hello",
            "the first message: `commands` where the front end would command; `answers` where somebody is there with keys",
            {"version": "number", "commands": "flag", "answers": "flag"},
            who="any",
        ),
        Message("vent", "every valve exhausts at once; taken before hello too", who="any"),
        Message(
            "here",
            "said now and then by a front end that can tell that it is not standing still; from then on, one that does, leaves",
            who="any",
        ),
        Message("leave", "the front end detaches; where it commands, the run's rule applies", who="any"),
        Message(
            "command",
            "whoever watches would command, where nobody does; `answers` as in hello",
            {"answers": "flag"},
            who="any",
        ),
        Message("when_left", "another rule for this run", {"rule": "rule"}),
        Message("preflight", "the pre-flight once more, before arming", states=DISARMED),
        Message("arm", "arm all boards: the operator's own deed", states=("idle",)),
        Message("play", "start, fibers first brought to that place", {"from_s": "seconds"}, states=("idle", "armed")),
        Message("pause", "stand and hold", states=("playing",)),
        Message("go_on", "go on from a pause or a cue that waits", states=("paused",)),
        Message("next_cue", "go to the next cue", states=MOVING),
        Message("jump", "go to another place of the score", {"to_s": "seconds"}, states=MOVING),
        Message("rest", "all down at their safe rate, then disarmed"),
        Message("stop", "end the run: rest, or vent where all are on their way to rest already"),
        Message("bring_back", "after a fault, a rest or a vent: a fresh pre-flight, arm, and go on", states=DISARMED),
        Message("hold", "hold-to-run is down, said anew every tenth of a second, or up", {"down": "flag"}),
        Message("let_go", "all hands let go of their fibers", states=MOVING),
        Message("record", "begin a take, or end it"),
        Message("map", "go by the map file as it is saved now; all hands let go"),
    )
}
"""What a front end may say, by name."""

TOLD = {
    row.name: row
    for row in (
        Message(
            "welcome",
            "the answer to hello, with the shared memory's descriptor; `about` is what the run is",
            {"version": "number", "run": "text", "pid": "number", "commands": "flag", "about": "object"},
        ),
        Message(
            "marks",
            "a pre-flight's marks: asked, ok, found, hint of each; whether there are boards that the operator has to arm",
            {"ok": "flag", "must_arm": "flag", "marks": "list"},
        ),
        Message(
            "told",
            "lines for the operator; `missed` is how many were dropped before them, as the front end did not keep up",
            {"lines": "list", "missed": "number"},
        ),
        Message("refused", "what was asked is not done, and why", {"what": "text", "why": "text"}),
        Message(
            "command",
            "whether this front end commands, whether any does, and the run's rule",
            {"commands": "flag", "taken": "flag", "rule": "rule"},
        ),
        Message(
            "inputs",
            "playing by hand: sources (name, last, at_s, count, silent), what was refused by reason, what the take says",
            {"seen": "list", "refused": "object", "take": "text"},
        ),
        Message(
            "ended",
            "the run is over, all is let go: its report, as JSON and in sentences",
            {"exit": "number", "report": "object", "lines": "list"},
        ),
        Message("failed", "the run did not come about, or broke off: why, in sentences", {"exit": "number", "lines": "list"}),
    )
}
"""What a run says, by name."""


class Unfit(ValueError):
    """A message that is none; the text says why."""


def packed(name: str, **fields: Any) -> bytes:
    """A message as it goes over the socket, its newline with it."""
    return json.dumps({"say": name, **fields}, allow_nan=False, separators=(",", ":")).encode() + b"\n"


def read(line: bytes, table: Mapping[str, Message], longest: int = LONGEST_ASKED) -> tuple[str, dict[str, Any]]:
    """The name and the fields of one line. Raises Unfit for whatever is not exactly what the table has."""
    if len(line) > longest:
        raise Unfit(f"longer than {longest} bytes")
    try:
        found = json.loads(line)
    except (ValueError, RecursionError):
        raise Unfit("no JSON") from None
    if not isinstance(found, dict) or not isinstance(found.get("say"), str):
        raise Unfit('no object with "say"')
    name = found.pop("say")
    row = table.get(name)
    if row is None:
        raise Unfit(f"'{name[:40]}' is unknown")
    fields = dict(row.fields)
    if found.keys() != fields.keys():
        raise Unfit(f"'{name}' has the fields {', '.join(fields) or 'none'}, and no others")
    for field, kind in fields.items():
        if not _FITS[kind](found[field]):
            raise Unfit(f"'{field}' of '{name}' is no {kind}")
    return name, found


def why_not(row: Message, commands: bool, state: str) -> str:
    """Why a message is not taken from that front end in that state; "" where it is."""
    if row.who == "commands" and not commands:
        return f"'{row.name}' is for the front end that commands; this one watches, and can vent"
    if state not in row.states:
        return f"'{row.name}' means nothing while the player is {state}"
    return ""


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool) and abs(value) < 1e15 and math.isfinite(value)


_FITS = {
    "flag": lambda value: isinstance(value, bool),
    "number": _is_number,
    "seconds": lambda value: _is_number(value) and value >= 0.0,
    "rule": lambda value: isinstance(value, str) and value in RULES,
    "text": lambda value: isinstance(value, str),
    "list": lambda value: isinstance(value, list),
    "object": lambda value: isinstance(value, dict),
}
