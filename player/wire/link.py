"""The states of a link to a board, as the host sees it, in one table; and what the host tells the engine.

The rules of the host's side:

1. `open` greets, and where the board answers in version 1 with channels enough, configures it; then it is ready. Greeting
   a board that is armed disarms it, by the protocol.
2. hello, configure, arm and rest are asked again, with the same seq, until the state with that seq comes; after so many
   tries they have failed. An answer that comes late or twice does no harm; unasked states in between are taken as what they
   say.
3. A fault with the seq of what was asked refuses it. So does a wrong rig, whatever its seq.
4. `vent` goes before all that is not yet sent, from every state, and is asked again every 50 ms.
5. Whatever ends a run other than by rest is followed by a vent: failure, a clock that jumps, a board that starts anew, one
   that says it is armed when it should not be.
6. From the greeting on, pings go out, often enough for the watchdog and the clock.
7. Sets are sent only while armed, only where the board's queue has room for all of their frames, and never more than a body
   holds.
8. Nothing heard for some time: Silent, once; then Back, once. Which of them ends the run is for the engine to say.
"""

from dataclasses import dataclass

from player.wire.messages import FAULTS

SHUT, GREETING, CONFIGURING, READY, ARMING = "shut", "greeting", "configuring", "ready", "arming"
ARMED, RESTING, VENTING, VENTED, FAILED = "armed", "resting", "venting", "vented", "failed"
STATES = (SHUT, GREETING, CONFIGURING, READY, ARMING, ARMED, RESTING, VENTING, VENTED, FAILED)

TRANSITIONS: dict[str, dict[str, str]] = {
    "open": dict.fromkeys(STATES, GREETING),
    "greeted": {GREETING: CONFIGURING},
    "configured": {CONFIGURING: READY},
    "arm": {READY: ARMING},
    "armed": {ARMING: ARMED},
    "rest": {ARMED: RESTING},
    "rested": {RESTING: READY},
    "vent": dict.fromkeys(STATES[1:], VENTING),
    "vented": {VENTING: VENTED},
    "tripped": {ARMED: VENTED, RESTING: VENTED},
    "disarmed": {ARMED: FAILED},
    "refused": {GREETING: FAILED, CONFIGURING: FAILED, READY: FAILED, ARMING: FAILED},
    "unanswered": {GREETING: FAILED, CONFIGURING: FAILED, ARMING: FAILED, RESTING: FAILED, VENTING: FAILED},
    "faulted": dict.fromkeys((CONFIGURING, READY, ARMING, ARMED, RESTING, VENTING), FAILED),
    "anew": dict.fromkeys((CONFIGURING, READY, ARMING, ARMED, RESTING), FAILED),
}
"""What happens, and where it leads from each state; a state that is not in the row stays as it is."""


@dataclass(frozen=True, slots=True)
class Moved:
    """The link is in another state than before, and why, in words for the operator."""

    was: str
    now: str
    why: str


@dataclass(frozen=True, slots=True)
class Trouble:
    """A fault as the board told it: code, channel (None: no one channel), text, seq of what caused it (0: nothing asked)."""

    code: int
    channel: int | None
    text: str
    seq: int

    @property
    def name(self) -> str:
        """The name of the code."""
        return FAULTS.get(self.code, f"code {self.code}")


@dataclass(frozen=True, slots=True)
class Sensed:
    """Strains that the board has sensed, 0 to 65535 of usable stroke, from channel `first` on, at a time of the host."""

    at_s: float
    first: int
    strain: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Silent:
    """Nothing has come from the board since a time of the host."""

    since_s: float


@dataclass(frozen=True, slots=True)
class Back:
    """The board is heard again, after so many seconds."""

    after_s: float


Event = Moved | Trouble | Sensed | Silent | Back
