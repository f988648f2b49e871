"""Every key of a rig file, declared once: the reader, its messages and the manual's page all read these tables."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

from composer.fiber.kinds import KINDS
from composer.keys import Key

MOST_BYTES = 2 << 20
MOST_LINES = 100_000
MOST_LINE = 4096
MOST_DOTS = 16
MOST_FAULTS = 100
MOST_FIBERS = 4096
MOST_CHANNELS = 4096
LONGEST_NAME = 64
FARTHEST_M = 10_000.0

NAME_RULE = "a name of letters, digits, '_', '-' and '.' that begins with a letter"


@dataclass(frozen=True, slots=True)
class Table:
    """A table of the file: `form` "one" for [NAME], "named" for [NAME.any], "rows" for [[NAME]]."""

    name: str
    form: Literal["one", "named", "rows"]
    says: str
    keys: tuple[Key, ...]


RIG = Table(
    "rig",
    "one",
    "The rig as a whole.",
    (
        Key("name", "text", "what the rig is called"),
        Key("ambient_kPa", "number", "pressure of the air around, absolute", "kPa", 50.0, 120.0, default=101.325),
        Key("temperature_C", "number", "temperature of air and fibers", "°C", -20.0, 60.0, default=20.0),
        Key(
            "worn",
            "switch",
            "on a person's body: every fiber then needs max_hold_s and its type max_pressure_kPa",
            default=False,
        ),
    ),
)

SUPPLY = Table(
    "supply",
    "one",
    "What fills the fibers.",
    (
        Key("medium", "choice", "what fills the fibers", default="air", choices=("air", "water")),
        Key("pressure_kPa", "number", "gauge pressure at the regulator", "kPa", 0.0, 2000.0, above=True),
        Key(
            "min_pressure_kPa",
            "number",
            "gauge pressure in the receiver below which the rig is short; not given: pressure_kPa",
            "kPa",
            0.0,
            2000.0,
            above=True,
            default=None,
        ),
        Key("receiver_L", "number", "volume of the receiver", "L", 0.0, 1e6, above=True),
        Key("max_receiver_kPa", "number", "gauge pressure at which the compressor cuts out", "kPa", 0.0, 2000.0, above=True),
        Key("compressor_L_min", "number", "free air delivery (ANR) of the compressor, or flow of the pump", "L/min", 0.0, 1e6),
        Key("polytropic", "number", "exponent of the gas: 1 isothermal to 1.4 adiabatic", "1", 1.0, 1.4, default=1.2),
    ),
)

TYPE_KEYS = (Key("kind", "choice", "the kind of fiber, which decides the other keys", choices=tuple(KINDS)),)
"""What every fiber type has; its other keys are those of its kind."""

FIBER_TYPE = Table("fiber_type", "named", "A make of fiber, by name.", TYPE_KEYS)

VALVE_TYPE = Table(
    "valve_type",
    "named",
    "A make of valve, by name.",
    (
        Key("C_dm3_s_bar", "number", "sonic conductance C of ISO 6358", "dm³/(s·bar)", 0.0, 1000.0, above=True),
        Key("b", "number", "critical pressure ratio b of ISO 6358", "1", 0.0, 0.95, default=0.3),
        Key("switch_ms", "number", "time that it takes to respond", "ms", 0.0, 10_000.0, default=10.0),
        Key("max_switch_Hz", "number", "how often a second it may switch", "Hz", 0.0, 10_000.0, above=True, default=50.0),
        Key(
            "drive",
            "choice",
            "what its driver takes: a pressure, a strain, or the valve's signed opening",
            default="pressure",
            choices=("pressure", "strain", "valve"),
        ),
        Key("duty", "number", "share of time that the coil may be energised", "1", 0.0, 1.0, above=True, default=1.0),
        Key("duty_burst_s", "number", "energised time allowed beyond that share, in any span", "s", 0.0, 1e6, default=30.0),
        Key(
            "energised_while_holding",
            "switch",
            "whether the coil is energised while its fiber holds above rest, too",
            default=False,
        ),
    ),
)

DRIVER = Table(
    "driver",
    "named",
    "A board of valves on a serial line of its own, by name; with no such table there is one board, called main.",
    (Key("channels", "integer", "how many channels it has", low=1, high=MOST_CHANNELS),),
)

HANGING = (
    Key("type", "text", "its fiber_type"),
    Key("valve", "text", "its valve_type; may be left out where the rig has only one", default=None),
    Key("driver", "text", "its driver; may be left out where the rig has only one", default=None),
    Key("tube_bore_mm", "number", "inner diameter of the tube from valve to fiber", "mm", 0.0, 100.0, above=True, default=2.0),
    Key("tube_length_mm", "number", "length of that tube", "mm", 0.0, 1e6, default=1000.0),
    Key("load_N", "number", "load along its axis, against its motion", "N", 0.0, 1e5, default=0.0),
    Key("bundle", "integer", "how many side by side on this one valve", low=1, high=10_000, default=1),
    Key("series", "integer", "how many end to end", low=1, high=10_000, default=1),
    Key("at_m", "vector", "where it hangs: x, y, z", "m", -FARTHEST_M, FARTHEST_M, default=(0.0, 0.0, 0.0)),
    Key("toward", "vector", "the way it runs from there, of any length but zero", "", -1e6, 1e6, default=(0.0, 0.0, -1.0)),
    Key("max_hold_s", "number", "longest time above half stroke; 0 for no limit", "s", 0.0, 1e6, default=0.0),
)
"""What [[fiber]] and [[fibers]] share."""

FIBER = Table(
    "fiber",
    "rows",
    "One fiber.",
    (
        Key("name", "text", "what scores call it"),
        *HANGING,
        Key(
            "channel",
            "integer",
            "its channel, counted from 0; no other fiber of its driver has it",
            low=0,
            high=MOST_CHANNELS - 1,
        ),
        Key("mirror", "text", "its partner in the mirror; said of one, it holds for both", default=None),
    ),
)

FIBERS = Table(
    "fibers",
    "rows",
    "A row of like fibers, called name.1, name.2 and so on.",
    (
        Key("name", "text", "what their names begin with"),
        Key("count", "integer", "how many", low=1, high=MOST_FIBERS),
        *HANGING,
        Key("first_channel", "integer", "channel of the first; the others follow", low=0, high=MOST_CHANNELS - 1, default=0),
        Key("step_m", "vector", "from each to the next", "m", -FARTHEST_M, FARTHEST_M, default=(0.0, 0.0, 0.0)),
        Key("mirrored", "switch", "the first has the last as its mirror, and so on inward", default=False),
    ),
)

GROUP = Table(
    "group",
    "one",
    "Names for selections of fibers: each key is a group, its value a list of names, ranges, wildcards and other groups.",
    (),
)

TABLES: dict[str, Table] = {table.name: table for table in (RIG, SUPPLY, FIBER_TYPE, VALVE_TYPE, DRIVER, FIBER, FIBERS, GROUP)}
"""Every table of a rig file, in the manual's order."""


def keys_of_type(table: Mapping[str, Any]) -> tuple[Key, ...]:
    """The keys of a fiber type's table as written: `kind` and those of its kind; `kind` alone where there is no such kind."""
    kind = table.get("kind")
    found = KINDS.get(kind) if isinstance(kind, str) else None
    return TYPE_KEYS + (found.keys_of(table) if found else ())
