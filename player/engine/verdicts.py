"""What something that a board tells means for the run, and in which words the operator hears of it."""

from player.engine.safety import FAULTS
from player.outputs.base import Event

RUNNING = ("playing", "paused")
NOT_ARMED = 3
ARMED = ("armed", "playing", "paused", "resting")


def verdict(event: Event, state: str) -> tuple[str, str]:
    """What an event means while the player is in `state`: ("", "") nothing, else an event of the safety table, or "note" for
    a fault that is told and kept while the run goes on, or "tell" for what is only told; and the sentence.
    """
    said = f"{event.driver}: {event.say}"
    if event.kind == "lost" or (event.kind == "silent" and state in ARMED):
        return "fault", said
    if event.kind == "fault" and event.code == NOT_ARMED and state not in RUNNING:
        # Sets were on their way when the run was ended for another reason.
        return "", ""
    if event.kind == "fault":
        name, means, sentence = FAULTS.get(event.code, (f"fault {event.code}", "fault", "a fault that is not known here"))
        return means, f"{event.driver}: {name}: {sentence}" + (f" ({event.say})" if event.say else "")
    if event.kind == "state" and state in RUNNING and event.status != "armed":
        return "fault", f"{event.driver}: the board is {event.status} in mid-run" + (f": {event.say}" if event.say else "")
    if event.kind == "note":
        return "tell", said
    return "", ""
