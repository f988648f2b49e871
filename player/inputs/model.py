"""A map: which control does what, with the fibers looked up."""

from dataclasses import dataclass
from fractions import Fraction

from player.inputs.schema import CURVES, KINDS


@dataclass(frozen=True, slots=True)
class Control:
    """A MIDI control: `kind` of `player.inputs.schema.KINDS`, its number (0 where the kind has none), channel 1 to 16.

    channel 0: any; port: part of a port's name, "" for any
    """

    kind: str
    number: int = 0
    channel: int = 0
    port: str = ""

    def __str__(self) -> str:
        """As the map file writes it."""
        number = "true" if KINDS[self.kind].key.type == "switch" else str(self.number)
        parts = [f"{self.kind} = {number}"]
        if self.channel:
            parts.append(f"channel = {self.channel}")
        if self.port:
            parts.append('port = "' + self.port.replace("\\", "\\\\").replace('"', '\\"') + '"')
        return "{ " + ", ".join(parts) + " }"


@dataclass(frozen=True, slots=True)
class Stroke:
    """The control's value is the stroke wanted, between `low` and `high` along `curve`."""

    fibers: tuple[int, ...]
    low: float = 0.0
    high: float = 1.0
    curve: str = "linear"
    pickup: bool = False
    how: str = "takes"

    def stroke(self, value: float) -> float:
        """The share of usable stroke that a control's value from 0 to 1 asks for."""
        return self.low + (self.high - self.low) * CURVES[self.curve].there(value)

    def value(self, stroke: float) -> float:
        """The control's value that asks for this stroke, as near as it comes: what a motor fader is sent."""
        if self.high == self.low:
            return 0.0
        return CURVES[self.curve].back(min(1.0, max(0.0, (stroke - self.low) / (self.high - self.low))))


@dataclass(frozen=True, slots=True)
class Play:
    """The control starts a phrase; `quantise` in counts, None: at once; `rest`: letting go brings its fibers to rest."""

    phrase: str
    fibers: tuple[int, ...]
    rest: bool = False
    quantise: Fraction | None = None
    how: str = "takes"


@dataclass(frozen=True, slots=True)
class Does:
    """The control asks for something of `player.inputs.schema.DOES`."""

    what: str


@dataclass(frozen=True, slots=True)
class Bind:
    """One bind: its control or its OSC address, what it is for, and the line of the map where it stands."""

    control: Control | None
    osc: str
    deed: Stroke | Play | Does
    line: int


@dataclass(frozen=True, slots=True)
class Map:
    """A map file as read; the index of a bind is its number in events."""

    file: str
    silence_s: float
    binds: tuple[Bind, ...]


NO_MAP = Map("", 0.0, ())
