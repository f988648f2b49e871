"""What something that a board tells means for the run, and in which words the operator hears of it."""

from player.engine.safety import FAULTS
from player.outputs.base import Event

RUNNING = ("playing", "paused")
NOT_ARMED = 3
ARMED = ("armed", "playing", "paused", "resting")

LOOK = {
    "lost": "look at its plug and cable",
    "silent": "look at its power and cable, and shut its supply by hand if its fibers stay up",
    "garbled": "look at its plug and cable, and at what disturbs them",
}
"""What the operator is to do about a line, by the kind of event."""

CAME_TO = {"fault": "has failed", "vented": "has vented", "idle": "has disarmed"}
"""What has become of a board, by what it says that it is."""

UNKNOWN = ("a fault not known here", "fault", "the board tells of a fault of its own", "look it up in the board's manual")


def verdict(event: Event, state: str) -> tuple[str, str]:
    """What an event means while the player is in `state`: ("", "") nothing, else an event of the safety table, or "note" for
    a fault that is told and kept while the run goes on, or "tell" for what is only told; and the sentence.
    """
    said = f"{event.driver}: {event.say}"
    if event.kind == "lost" or (event.kind in LOOK and state in ARMED):
        return "fault", f"{said}; {LOOK[event.kind]}"
    if event.kind == "fault" and event.code == NOT_ARMED and state not in RUNNING:
        # Sets were on their way when the run was ended for another reason.
        return "", ""
    if event.kind == "fault":
        _, means, sentence, look = FAULTS.get(event.code, UNKNOWN)
        return means, f"{event.driver}: {sentence}" + (f" ({event.say})" if event.say else "") + f"; {look}"
    if event.kind == "state" and state in RUNNING and event.status != "armed":
        why = f": {event.say}" if event.say else ""
        came_to = CAME_TO.get(event.status, f"is {event.status}")
        return "fault", f"{event.driver}: the board {came_to} in mid-run{why}; look at its power and line"
    if event.kind == "note":
        return "tell", said
    return "", ""
