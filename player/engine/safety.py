"""The safety states as one table: what may happen in each, what follows, and what must be done on the way.

The engine, the manual and the tests read this table; there is no other place that decides what is allowed.
"""

from dataclasses import dataclass

STATES = {
    "idle": "disarmed; nothing moves and nothing is sent",
    "armed": "the boards are ready; all fibers at rest",
    "playing": "sets are sent as the score goes on",
    "paused": "the score stands still; fibers hold, each within its max_hold_s",
    "resting": "fibers are let down to rest at their safe rate",
    "vented": "every valve exhausts, boards disarmed, until a fresh pre-flight and arming",
}

EVENTS = {
    "preflight": "a pre-flight found everything in order",
    "arm": "the operator arms, by hand or with --arm",
    "play": "the operator starts the score",
    "pause": "the operator pauses",
    "wait": "the score reaches a cue that waits",
    "go_on": "the operator goes on",
    "end": "the score is over",
    "rest": "the operator stops (Ctrl-C, SIGTERM)",
    "fault": "a board is lost, or reports a fault after which the run cannot go on",
    "at_rest": "the last fiber has come to rest",
    "vent": "the operator vents (Ctrl-C a second time), or a board reports over-pressure",
}


@dataclass(frozen=True, slots=True)
class Transition:
    """A row: in `state`, on `event`, to `next`; `must` are the deeds of the engine, in this order.

    fresh: only after a pre-flight that nothing has used up yet
    """

    state: str
    event: str
    next: str
    must: tuple[str, ...] = ()
    fresh: bool = False


DEEDS = {
    "arm": "every board is armed",
    "start": "the score runs, fibers first brought to where it has them",
    "hold": "the score eases to a stand and the fibers hold",
    "resume": "the score goes on, fibers first brought back to where it has them",
    "let_down": "the score eases to a stand and every fiber goes to rest at its safe rate",
    "disarm": "every board is told to rest and disarm",
    "vent": "every board is told to vent, ahead of whatever is queued",
}

TABLE = (
    Transition("idle", "preflight", "idle"),
    Transition("idle", "arm", "armed", ("arm",), fresh=True),
    Transition("idle", "fault", "idle"),
    Transition("armed", "play", "playing", ("start",)),
    Transition("armed", "rest", "resting", ("let_down",)),
    Transition("armed", "fault", "resting", ("let_down",)),
    Transition("playing", "pause", "paused", ("hold",)),
    Transition("playing", "wait", "paused"),
    Transition("playing", "end", "resting", ("let_down",)),
    Transition("playing", "rest", "resting", ("let_down",)),
    Transition("playing", "fault", "resting", ("let_down",)),
    Transition("paused", "go_on", "playing", ("resume",)),
    Transition("paused", "rest", "resting", ("let_down",)),
    Transition("paused", "fault", "resting", ("let_down",)),
    Transition("resting", "at_rest", "idle", ("disarm",)),
    Transition("resting", "fault", "resting"),
    Transition("vented", "preflight", "idle"),
    Transition("vented", "fault", "vented"),
    *(Transition(state, "vent", "vented", ("vent",)) for state in STATES),
)
"""Every transition there is. An event without a row for the present state is refused and changes nothing."""

_ROWS = {(row.state, row.event): row for row in TABLE}

STOPS_AGAIN = "vent"
"""What the operator's stop means when the fibers are on their way to rest already."""


@dataclass(frozen=True, slots=True)
class Safety:
    """The state a run is in; `checked`: a pre-flight has been passed since it was last idle or vented, and not yet used."""

    state: str = "idle"
    checked: bool = False


class Refused(Exception):
    """An event that has no row in the table for the present state; the text says why, for the operator."""


def after(safety: Safety, event: str) -> tuple[Safety, tuple[str, ...]]:
    """The state after an event, and what must be done.

    Raises:
        Refused: no such transition, or it needs a fresh pre-flight; the state stays as it is.
    """
    row = _ROWS.get((safety.state, event))
    if row is None:
        allowed = ", ".join(sorted(r.event for r in TABLE if r.state == safety.state))
        raise Refused(f"'{event}' means nothing while the player is {safety.state}; it would take {allowed}")
    if row.fresh and not safety.checked:
        raise Refused(f"'{event}' needs a pre-flight first, passed since the player was last idle or vented")
    return Safety(row.next, checked=event == "preflight"), row.must


FAULTS = {
    1: (
        "watchdog",
        "fault",
        "the board heard nothing in time and vented its fibers",
        "look at its line, and end what keeps this machine busy",
    ),
    2: (
        "rig mismatch",
        "fault",
        "the board is set up for another rig",
        "load the rig onto the board again, or play with the rig file that it has",
    ),
    3: (
        "not armed",
        "fault",
        "the board is not armed, so its fibers do not move",
        "look at its power: it may have started anew",
    ),
    4: (
        "bad command",
        "fault",
        "the board did not understand what it was sent",
        "look at its line, and at which version of the wire protocol it speaks",
    ),
    5: ("queue full", "note", "the board's queue was full and it dropped a set", "play at a lower --rate"),
    6: (
        "over-pressure",
        "vent",
        "the board measures more pressure than a fiber may have",
        "look at regulator and relief valve",
    ),
    7: (
        "sensor",
        "note",
        "a sensor of the board does not answer as it should",
        "look at the sensor's plug and cable",
    ),
}
"""Fault codes of the wire protocol: name, the event it is to the run ("note": told and counted, the run goes on), what has
happened, and what to do."""
