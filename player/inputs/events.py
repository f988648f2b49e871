"""What inputs have to say, whatever they are: each event is a value, none of them does anything by itself.

Times are seconds of the caller's steady clock; an event with `at_s` in the future is meant for then.
"""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Wanted:
    """Fibers (indices) are wanted at `stroke`, a share of usable stroke from 0 to 1, mixed in by `how`.

    source: where it came from, a port's name or "osc"; bind: index of the bind in its map, -1 for a fixed address
    """

    source: str
    at_s: float
    fibers: tuple[int, ...]
    stroke: float
    how: str = "takes"
    bind: int = -1


@dataclass(frozen=True, slots=True)
class Begin:
    """A phrase begins on fibers, its targets times `scale`; `key` names this playing of it for the `End` that may follow."""

    source: str
    at_s: float
    phrase: str
    fibers: tuple[int, ...]
    scale: float
    key: tuple[object, ...]
    how: str = "takes"
    bind: int = -1


@dataclass(frozen=True, slots=True)
class End:
    """The hand has let go of a phrase: with `rest` its fibers are brought to rest, else it plays to its own end."""

    source: str
    at_s: float
    key: tuple[object, ...]
    fibers: tuple[int, ...]
    rest: bool


@dataclass(frozen=True, slots=True)
class Ask:
    """The operator asks for something: one of `player.inputs.schema.DOES`, or "cue" with its name."""

    source: str
    at_s: float
    what: str
    name: str = ""


@dataclass(frozen=True, slots=True)
class HoldToRun:
    """The pedal or key that a worn rig wants held has gone down, or up."""

    source: str
    at_s: float
    down: bool


@dataclass(frozen=True, slots=True)
class Silent:
    """A source has fallen silent, or is gone: the fibers that it drove are to come to rest. `why` is for the operator."""

    source: str
    at_s: float
    fibers: tuple[int, ...]
    why: str


@dataclass(frozen=True, slots=True)
class Back:
    """A source is there again."""

    source: str
    at_s: float


@dataclass(frozen=True, slots=True)
class Timing:
    """Something that a follower of clocks reads: `what` a kind of message, `value` its number.

    what: "clock", "start", "continue", "stop", "songpos" (value in sixteenths), "quarter_frame" (value the data byte) or
    "full_frame" (value hours, minutes, seconds, frames packed as the standard has them, big-endian)
    """

    source: str
    at_s: float
    what: str
    value: int = 0


Event = Wanted | Begin | End | Ask | HoldToRun | Silent | Back | Timing
