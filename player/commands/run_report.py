"""What a run was, told afterwards: as one JSON object, and as a few sentences."""

from collections.abc import Sequence
from typing import Any

import numpy as np

from player.commands.counted import sentence, small
from player.commands.earlier_logs import sentences as drift_sentences
from player.commands.played import Played
from player.commands.priority import Permitted
from player.engine.loop import Engine
from player.engine.standing import WHERE
from player.outputs.base import Output


def report(engine: Engine, played: Played, outputs: Sequence[Output], permitted: Permitted) -> dict[str, Any]:
    """Everything of a run that has ended; times in s, lateness in ms, strains as 1."""
    ending, lateness = engine.ending, engine.lateness
    faults = [
        {
            "place": played.say_place(one.position_s),
            "position_s": round(one.position_s, 6),
            "driver": one.driver,
            "say": one.say,
        }
        for one in ending.faults
    ]
    return {
        "ended": ending.how,
        "why": ending.why,
        "exit": ending.exit_code,
        "state": ending.state,
        "score": played.path,
        "rig": played.rig.file,
        "place": played.say_place(ending.position_s),
        "position_s": round(ending.position_s, 6),
        "duration_s": round(ending.lasted_s, 6),
        "rate_Hz": engine.rate_Hz,
        "ahead_ms": round(engine.ahead_s * 1e3, 3),
        "priority": permitted.priority,
        "memory": permitted.memory,
        "ticks": lateness.ticks,
        "late_ticks": lateness.late,
        "past_due": lateness.past_due,
        "stalls": lateness.slips,
        "stalled_s": round(lateness.slipped_s, 6),
        "lateness_ms": {
            "p50": round(lateness.quantile_s(0.5) * 1e3, 4),
            "p99": round(lateness.quantile_s(0.99) * 1e3, 4),
            "p99.9": round(lateness.quantile_s(0.999) * 1e3, 4),
            "max": round(lateness.worst_s * 1e3, 4),
        },
        "faults": faults,
        "more_faults": ending.more_faults,
        "outputs": [{"target": one.target, "drivers": list(one.drivers), **one.counters()} for one in outputs],
        "largest_error": _largest_error(engine, played),
        "stood": {
            where.replace(" ", "_"): [round(float(one), 5) if np.isfinite(one) else None for one in column]
            for where, column in zip(WHERE, engine.sensing.standing.means.T, strict=True)
        },
    }


def _largest_error(engine: Engine, played: Played) -> dict[str, Any] | None:
    """Where wanted and sensed were furthest apart; None where nothing was sensed."""
    worst = engine.sensing.errors.worst
    if worst is None:
        return None
    return {
        "error": round(worst.error, 9),
        "error_of_stroke": round(worst.error / float(played.abilities.stroke[worst.fiber]), 9),
        "fiber": played.names[worst.fiber],
        "place": played.say_place(worst.position_s),
        "wanted": round(worst.wanted, 9),
        "sensed": round(worst.sensed, 9),
    }


HOW = {
    "end": "Played to its end",
    "stopped": "Stopped and brought to rest",
    "vented": "Vented",
    "fault": "Ended by a fault",
}


def sentences(told: dict[str, Any]) -> list[str]:
    """The report as a person reads it."""
    lines = [f"{HOW[told['ended']]} at {told['place']} after {told['duration_s']:.1f} s; the player is {told['state']}."]
    late = told["lateness_ms"]
    lines.append(
        f"{told['ticks']} ticks at {told['rate_Hz']:g} Hz, sent {told['ahead_ms']:.0f} ms ahead; {told['late_ticks']} late by"
        f" more than a tick, {told['past_due']} past due (99 % within {max(late['p99'], 0.01):.2f} ms, worst"
        f" {small(late['max'])} ms)."
    )
    if told["stalls"]:
        times = (
            f"{told['stalls']} times, {told['stalled_s']:.2f} s in all"
            if told["stalls"] > 1
            else f"for {told['stalled_s']:.2f} s"
        )
        lines.append(f"The host stood still {times}; the score waited for it.")
    error = told["largest_error"]
    if error is not None:
        lines.append(
            f"Furthest from the score: {error['fiber']} at {error['place']}, by {small(100.0 * error['error_of_stroke'])} %"
            " of its stroke."
        )
    lines += map(sentence, told["outputs"])
    lines += drift_sentences(told.get("drift", {"fibers": ()}))
    lines += [f"Fault at {fault['place']}: {fault['say']}." for fault in told["faults"]]
    if told["more_faults"]:
        lines.append(f"... and {told['more_faults']} more of them.")
    return lines
