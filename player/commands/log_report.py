"""A run's log as one JSON object, and as what a person reads."""

from collections.abc import Iterator
from typing import Any

import numpy as np

from player.commands.counted import sentence, small
from player.commands.earlier_logs import drift
from player.commands.earlier_logs import sentences as drift_sentences
from player.commands.run_report import HOW
from player.engine.told import Told, apart, landings, lateness

SHOWN = 12
"""Landings and fibers that a person is told of; JSON has all."""

BAR = 40
BREAKS_OFF = "the log breaks off: the player was killed, could not write on, or is still at it"


def as_object(log: Told, path: str, left: int) -> dict[str, Any]:
    """Everything that a log tells; `left`: bytes at its end that are no whole record. Errors are shares of stroke."""
    landed = landings(log)
    faults = _faults(log)
    ended = log.end.get("ended") if log.end else None
    return {
        "log": path,
        "sound": log.end is not None and left == 0,
        "left_bytes": left,
        **{key: log.head.get(key) for key in ("played", "kind", "title", "rig", "fingerprint", "targets", "date", "rate_Hz")},
        "ended": ended if isinstance(ended, str) else "broken off",
        "why": str(log.end.get("why", "")) if log.end else BREAKS_OFF,
        "exit": 0 if log.end is not None and left == 0 and log.end.get("exit") == 0 else 1,
        "place": _last_place(log),
        "position_s": round(float(log.position_s[-1]), 6) if len(log.position_s) else 0.0,
        "duration_s": round(float(log.in_force_s[-1] - log.in_force_s[0]), 6) if len(log.in_force_s) else 0.0,
        "sets": len(log.in_force_s),
        "outputs": _outputs(log),
        "senses": sum(len(part.at_s) for part in log.sensed),
        "lateness": [{"to_ms": None if np.isinf(edge) else edge, "ticks": count} for edge, count in lateness(log)],
        "latest_ms": round(float(log.late_s.max(initial=0.0)) * 1e3, 4),
        "hits": [
            {
                "place": one.place,
                "at_s": round(one.at_s, 6),
                "fiber": log.fibers[one.fiber],
                "wanted": round(one.wanted, 5),
                "sensed": round(one.sensed, 5),
                "error": round(one.error, 5),
                "strain_error": round(one.strain_error, 6),
            }
            for one in landed
        ],
        "fibers": [
            {"fiber": name, "mean_error": _number(signed), "mean_distance": _number(size), "largest": _number(most)}
            for name, (signed, size, most) in zip(log.fibers, apart(log), strict=True)
        ],
        "supply": _supply(log),
        "drift": _drift(log, path),
        "faults": faults,
        "happened": [_happened(record) for record in log.happened if record.kind in ("state", "command", "slip", "alarm")],
    }


def _drift(log: Told, path: str) -> dict[str, Any]:
    """How its fibers stand beside those of earlier runs of the rig that lie in the log's folder."""
    stood = log.end.get("stood") if log.end is not None else None
    return drift(path, str(log.head.get("fingerprint")), str(log.head.get("date")), stood, list(log.fibers))


def _number(value: float) -> float | None:
    return round(float(value), 5) if np.isfinite(value) else None


def _last_place(log: Told) -> str:
    if log.end is not None and isinstance(log.end.get("place"), str):
        return log.end["place"]
    at_s = float(log.position_s[-1]) if len(log.position_s) else 0.0
    before = [place for hit_s, place, _ in log.hits if hit_s <= at_s + 1e-6]
    return f"after {before[-1]}" if before else f"{at_s:.1f}s"


def _faults(log: Told) -> list[dict[str, Any]]:
    """What went wrong, with its place: faults, alarms, lost boards, and the host standing still."""
    found = []
    for record in log.happened:
        say = record.told
        wrong = record.kind in ("alarm", "slip") or (record.kind == "board" and say.get("kind") in ("fault", "lost", "silent"))
        if wrong:
            words = _stood_still(say.get("seconds")) if record.kind == "slip" else str(say.get("say", ""))
            name = str(say.get("kind") or record.kind) if record.kind == "board" else record.kind
            driver = str(say.get("driver") or _fiber(log, say.get("fiber")))
            found.append(
                {"place": str(say.get("place", "")), "time_s": round(record.time_s, 6), "kind": name}
                | {"of": driver, "code": say.get("code") or None, "say": words}
            )
    return found


def _outputs(log: Told) -> list[dict[str, Any]]:
    """What outputs had counted at the end; none where the log breaks off, or has it otherwise than it is written here."""
    found = log.end.get("outputs") if log.end is not None else None
    rows = [one for one in found if isinstance(one, dict)] if isinstance(found, list) else []
    return [one for one in rows if _is_counted(one)]


def _is_counted(output: dict[str, Any]) -> bool:
    drivers, numbers = output.get("drivers"), [value for key, value in output.items() if key not in ("target", "drivers")]
    named = isinstance(output.get("target"), str) and isinstance(drivers, list) and all(isinstance(one, str) for one in drivers)
    return named and "sets" in output and all(isinstance(one, int | float) for one in numbers)


def _stood_still(seconds: Any) -> str:
    return "the host stood still" + (f" for {seconds:.3f} s" if isinstance(seconds, int | float) else "")


def _fiber(log: Told, number: Any) -> str:
    """The name of the fiber that an alarm is about, "" where it is about none."""
    return log.fibers[number] if isinstance(number, int) and 0 <= number < len(log.fibers) else ""


def _supply(log: Told) -> list[dict[str, Any]]:
    """The lowest that each board's sensor of the supply has read."""
    told = log.head.get("drivers")
    drivers = told if isinstance(told, list) else []
    lowest: dict[int, float] = {}
    for driver, _, kPa in log.supply:
        lowest[driver] = min(kPa, lowest.get(driver, kPa))
    return [
        {"driver": str(drivers[one]) if one < len(drivers) else str(one), "lowest_kPa": round(kPa, 1)}
        for one, kPa in sorted(lowest.items())
    ]


def _happened(record) -> dict[str, Any]:
    return {"kind": record.kind, "time_s": round(record.time_s, 6), **record.told}


def sentences(whole: dict[str, Any]) -> Iterator[str]:
    """What a person reads."""
    title = whole["title"] or whole["played"]
    yield f"{title}, on {whole['rig']}, to {' '.join(map(str, whole['targets'] or []))}; {whole['date']}"
    if not whole["sound"]:
        cut = f"; the last {whole['left_bytes']} bytes are no whole record" if whole["left_bytes"] else ""
        yield f"The log breaks off {_at(whole['place'])}{cut}. What follows tells of the run up to there."
    how = HOW.get(whole["ended"], "Broken off")
    yield f"{how} {_at(whole['place'])}" + (f": {whole['why']}." if whole["why"] and whole["ended"] != "end" else ".")
    yield f"{whole['sets']} sets in {whole['duration_s']:.1f} s at {whole['rate_Hz']:g} Hz; {whole['senses']} senses."
    yield from map(sentence, whole["outputs"])
    yield from _lateness(whole)
    yield from _hits(whole)
    for one in whole["supply"]:
        yield f"Supply at {one['driver']}: {one['lowest_kPa']:.0f} kPa at its lowest."
    yield from drift_sentences(whole["drift"])
    if not whole["faults"] and whole["ended"] in HOW and whole["ended"] != "fault":
        yield "No faults."
    yield from _went_wrong(whole["faults"])


def _at(place: str) -> str:
    return place if place.startswith("after ") else f"at {place}"


def _went_wrong(faults: list[dict[str, Any]]) -> Iterator[str]:
    """A line for each thing that went wrong; what came again and again is one, with its first place and its last."""
    alike: dict[tuple[Any, ...], list[str]] = {}
    for one in faults:
        alike.setdefault((one["kind"], one["code"], one["of"], one["say"]), []).append(one["place"] or "an unknown place")
    for (kind, code, of, say), places in alike.items():
        where = f"At {places[0]}" if places[0] == places[-1] else f"From {places[0]} to {places[-1]}"
        where += f", {len(places)} times" if len(places) > 1 else ""
        yield (
            f"{where}: {kind}"
            + (f" {code}" if code else "")
            + (f", {of}" if of and not say.startswith(f"{of} ") else "")
            + (f": {say}" if say else "")
        )


def _lateness(whole: dict[str, Any]) -> Iterator[str]:
    counts = [one["ticks"] for one in whole["lateness"]]
    if not sum(counts):
        return
    yield f"Ticks by how late they came (the latest {small(whole['latest_ms'])} ms):"
    last = max(n for n, count in enumerate(counts) if count)
    for one in whole["lateness"][: last + 1]:
        edge = "later" if one["to_ms"] is None else f"to {one['to_ms']:g} ms"
        bar = "█" * max(round(BAR * one["ticks"] / max(counts)), 1 if one["ticks"] else 0)
        yield f"  {edge:>10} {one['ticks']:>8}  {bar}".rstrip()


def _signed(percent: float) -> str:
    """With its sign, unless it reads 0."""
    return f"{percent:+.2f}" if abs(percent) >= 0.005 else "0.00"


def _hits(whole: dict[str, Any]) -> Iterator[str]:
    hits = whole["hits"]
    if not hits:
        yield "No landing was sensed, so none can be judged."
        return
    sizes = sorted(abs(one["error"]) for one in hits)
    middle = 100.0 * sizes[len(sizes) // 2]
    yield f"{len(hits)} landings sensed: half of them within {max(middle, 0.01):.2f} % of stroke. The worst:"
    wide = max(len("fiber"), *(len(one["fiber"]) for one in hits[:SHOWN]))
    yield f"  {'place':<10} {'fiber':<{wide}}   wanted   sensed    off by"
    for one in hits[:SHOWN]:
        parts = f"{100 * one['wanted']:6.1f} % {100 * one['sensed']:6.1f} % {_signed(100 * one['error']):>7} %"
        yield f"  {one['place']:<10} {one['fiber']:<{wide}} {parts}"
