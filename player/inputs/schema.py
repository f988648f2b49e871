"""Every key of a map file, declared once: the reader, its messages and the manual's page all read these tables."""

import math
from collections.abc import Callable
from dataclasses import dataclass

from composer.keys import Key

MOST_BINDS = 2048

DOES = {
    "vent": "every valve exhausts, at once",
    "rest": "all fibers come to rest at their safe rate",
    "pause": "the score stands still and the fibers hold",
    "go_on": "go on from a pause or a cue that waits",
    "next_cue": "jump to the next cue",
    "tap_tempo": "beat the tempo by hand",
    "hold_to_run": "must be held for a worn rig to run; letting go brings all to rest",
}
"""What a control may do besides moving fibers."""

HOW = {
    "takes": "the control takes its fibers over from the score",
    "adds": "the control's stroke is added to the score's",
    "scales": "the score's stroke is multiplied by the control's",
}
"""How a hand and a running score are mixed on the same fibers."""


@dataclass(frozen=True, slots=True)
class Curve:
    """How a control's way, 0 to 1, becomes the share between low and high; `back` is the inverse."""

    says: str
    there: Callable[[float], float]
    back: Callable[[float], float]


CURVES = {
    "linear": Curve("as it is", lambda x: x, lambda y: y),
    "gentle": Curve("the square: fine near low", lambda x: x * x, math.sqrt),
    "steep": Curve("the square root: fine near high", math.sqrt, lambda y: y * y),
}

SOURCE = (
    Key(
        "silence_s",
        "number",
        "a controller that says nothing for so long has its fibers come to rest; 0: it may lie still for ever",
        "s",
        0.0,
        3600.0,
        default=0.0,
    ),
)


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of MIDI control: `key` says what its key must be, `full` the largest value that it sends."""

    key: Key
    full: int
    says: str


def _number(name: str, high: int, says: str) -> Key:
    return Key(name, "integer", says, "", 0, high, default=None)


KINDS = {
    kind.key.name: kind
    for kind in (
        Kind(_number("cc", 119, "the number of a controller"), 127, "a knob, fader or pedal of 7 bits"),
        Kind(_number("cc14", 31, "its number n; n + 32 carries the fine part"), 16383, "a knob or fader of 14 bits"),
        Kind(_number("note", 127, "the number of a note; 60 is middle C"), 127, "a key or pad"),
        Kind(
            Key("bend", "switch", "true: the pitch wheel, whose middle is one half", default=None),
            16383,
            "the pitch wheel; its middle is one half",
        ),
        Kind(
            Key("pressure", "switch", "true: how hard the keys of the channel are pressed", default=None),
            127,
            "how hard the keys of a channel are pressed",
        ),
        Kind(_number("poly_pressure", 127, "the number of a note"), 127, "how hard one key is pressed"),
    )
}
"""The kinds of MIDI control, by the key that names them; controllers from 120 on are channel mode messages, no controls."""

MIDI = (
    *(kind.key for kind in KINDS.values()),
    Key("channel", "integer", "its channel, 1 to 16; not given: any", "", 1, 16, default=None),
    Key("port", "text", "part of the name of the port that it comes from; not given: any", default=""),
)

CONTROL = (Key("osc", "text", 'the OSC address that it comes from, such as "/reeds"', default=None),)

BIND_STROKE = (
    Key("fibers", "text", "the fibers that it moves: a fiber, group, range or wildcard, or several with commas", default=None),
    Key("as", "choice", "what its value is", default="stroke", choices=("stroke",)),
    Key("low", "number", "the stroke wanted at the control's lower end", "share of usable stroke", 0.0, 1.0, default=0.0),
    Key("high", "number", "the stroke wanted at its upper end", "share of usable stroke", 0.0, 1.0, default=1.0),
    Key("curve", "choice", "how the way between is shared out", default="linear", choices=tuple(CURVES)),
    Key("pickup", "switch", "do nothing until the control passes the present value", default=False),
)

BIND_PHRASE = (
    Key("phrase", "text", "the phrase of the score that it starts; velocity scales it", default=None),
    Key("on", "text", "the fibers that play the phrase, written as for fibers", default=None),
    Key(
        "release",
        "choice",
        "when it is let go: the phrase plays to its end, or goes to rest",
        default="end",
        choices=("end", "rest"),
    ),
    Key("quantise", "text", 'start on the next such part of the running tempo, in counts, such as "1/2"', default=None),
)

BIND_DOES = (Key("does", "choice", "what it does besides moving fibers", default=None, choices=tuple(DOES)),)

BIND_HOW = (Key("how", "choice", "how it is mixed with a running score", default="takes", choices=tuple(HOW)),)

BIND = (*CONTROL, *BIND_STROKE, *BIND_PHRASE, *BIND_DOES, *BIND_HOW)

FORMS = {"fibers": (*BIND_STROKE, *BIND_HOW), "phrase": (*BIND_PHRASE, *BIND_HOW), "does": BIND_DOES}
"""What a bind is, by the key that says so, and the keys that it may then have beside its control."""
