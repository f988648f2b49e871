"""Why a fiber is not where it is wanted: one number a fiber and tick, for meters and log."""

from dataclasses import dataclass

NONE, STROKE, RATE, ACCEL, SWITCHING, DUTY, HOLD, AIR = range(8)


@dataclass(frozen=True, slots=True)
class Cause:
    """What cut a fiber: `kind` as a snag of the check has it, `shown` in few letters, `about` in words for the operator."""

    kind: str
    shown: str
    about: str


CAUSES: tuple[Cause, ...] = (
    Cause("none", "", "it is where it is wanted"),
    Cause("stroke", "stroke", "wanted above the usable stroke or below rest"),
    Cause("rate", "rate", "on its way as fast as it fills or exhausts"),
    Cause("accel", "accel", "gathering speed, or braking, at its acceleration limit"),
    Cause("switching", "switch", "its coil has only just been switched on and stays on a little longer"),
    Cause("duty", "duty", "its coil has been energised for as long as it may be; it fills again when it has recovered"),
    Cause("hold", "hold", "held above half stroke for as long as it may be; it comes up again once wanted lower"),
    Cause("air", "air", "the receiver is at its least pressure; filling fibers share what the compressor delivers"),
)
"""By number: the `cut` of a tick is an index into this table."""
