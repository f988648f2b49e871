"""What holds a moved hit, and what a pin costs, as one sentence each: for the report, for JSON and for an editor."""

from collections.abc import Sequence
from typing import Any

from composer.report.sentences import place_in_words
from composer.retime.proof import Cause, PinCost
from composer.score.tempo import TempoMap

STEPS_S = 0.01
"""The step of time that a pin's cost is told for."""

WHY = {
    "fill": " at its fastest fill",
    "exhaust": " at its fastest exhaust",
    "accel": ", as it can speed up no harder",
    "speed": " at its fastest",
    "quiver": " at its fastest with a quiver on top",
}


def cause_in_words(cause: Cause, names: Sequence[str], tempo: TempoMap) -> str:
    """One sentence, without a full stop, on what holds a moved hit where it is; places are those of the score as written."""
    return _KINDS[cause.kind](cause, names, lambda at_s: "the start" if at_s == 0.0 else tempo.say_place(at_s))


def cause_as_json(cause: Cause, names: Sequence[str], tempo: TempoMap) -> dict[str, Any]:
    """What holds a hit, for programs; `says` is the sentence."""
    return {
        "kind": cause.kind,
        "fiber": None if cause.fiber is None else names[cause.fiber],
        "from_s": cause.from_s,
        "to_s": cause.to_s,
        "needs_s": cause.needs_s if cause.kind == "move" else None,
        "line": cause.line or None,
        "strokes": cause.force,
        "says": cause_in_words(cause, names, tempo),
    }


def pin_in_words(cost: PinCost, at_s: float, tempo: TempoMap) -> str:
    """What a pin costs, as a sentence."""
    place = place_in_words(tempo.say_place(at_s))
    if cost.force == 0.0:
        return f"The pin at {place} holds nothing back."
    way = "later" if cost.force > 0.0 else "earlier"
    spared = abs(cost.force) * STEPS_S
    return (
        f"The pin at {place} costs {abs(cost.force):.3g} stroke-seconds a second: giving way {STEPS_S * 1000.0:.0f} ms {way} "
        f"(within {STEPS_S}s) would spare up to {spared:.2g}."
    )


def _move(cause: Cause, names: Sequence[str], at) -> str:
    begins = cause.from_s if cause.after_s is None else cause.after_s
    who = names[cause.fiber] if cause.fiber is not None else ""
    says = f"{who} needs {_seconds(cause.needs_s)} for its move to {at(cause.to_s)}{WHY[cause.by]}"
    if cause.after_s is not None:
        first = "before the start" if begins == 0.0 else f"before it has landed at {at(begins)}"
        says += f", and cannot leave {first}"
    return says + (f"; {at(cause.to_s)} is pinned" if cause.pin >= 0 else "")


def _order(cause: Cause, names: Sequence[str], at) -> str:
    if cause.from_s == cause.to_s or cause.from_s == 0.0:
        return f"the hit at {at(cause.to_s)} keeps its place in the order of hits"
    return f"the hits at {at(cause.from_s)} and {at(cause.to_s)} keep their order"


def _pin(cause: Cause, names: Sequence[str], at) -> str:
    return f"the pin stands against the hit at {at(cause.to_s)}"


def _hold(cause: Cause, names: Sequence[str], at) -> str:
    return f"{_who(cause, names)} may stay above half stroke no longer, from {at(cause.from_s)} to {at(cause.to_s)}"


def _duty(cause: Cause, names: Sequence[str], at) -> str:
    return f"the coil of {_who(cause, names)} needs rest between {at(cause.from_s)} and {at(cause.to_s)}"


def _air(cause: Cause, names: Sequence[str], at) -> str:
    return f"receiver and compressor have no more air between {at(cause.from_s)} and {at(cause.to_s)}"


def _switching(cause: Cause, names: Sequence[str], at) -> str:
    return f"the valve of {_who(cause, names)} may not switch on again sooner, between {at(cause.from_s)} and {at(cause.to_s)}"


def _rest(cause: Cause, names: Sequence[str], at) -> str:
    return f"{_who(cause, names)} has no time left to wait between {at(cause.from_s)} and {at(cause.to_s)}"


def _rhythm(cause: Cause, names: Sequence[str], at) -> str:
    return f"it keeps its distance from {at(cause.from_s)}" if cause.from_s > 0.0 else "it keeps its distance from the start"


def _who(cause: Cause, names: Sequence[str]) -> str:
    return names[cause.fiber] if cause.fiber is not None else "a fiber"


def _seconds(value: float) -> str:
    return f"{value * 1000.0:.3g} ms" if value < 0.0995 else f"{value:.3f} s"


_KINDS = {
    "move": _move, "order": _order, "pin": _pin, "hold": _hold, "duty": _duty, "air": _air, "rest": _rest, "rhythm": _rhythm,
    "switching": _switching,
}  # fmt: skip
