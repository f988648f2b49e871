"""What retiming did, in sentences and as JSON."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import Any

from composer.limits.check import Check
from composer.limits.snag import Snag
from composer.report.causes import cause_as_json, cause_in_words, pin_in_words
from composer.report.check import snag_as_json
from composer.report.sentences import Teller, named, tell
from composer.retime.proof import Cause, PinCost, causes, pin_costs
from composer.retime.retiming import Lead, MovedHit, PinsShort, Retiming
from composer.rig.model import Rig
from composer.score.tempo import TempoMap
from composer.warp import Warp

SAME_S = 1e-6
"""Displacements that differ by less are told as one."""

PROVEN = 1e-6
"""A cost within this share of its bound is the least there is."""


def is_good(retiming: Retiming, checked: Check) -> bool:
    """Whether the rig can do the score now."""
    return checked.ok and not retiming.pins_short


def as_json(retiming: Retiming, checked: Check, rig: Rig, tempo: TempoMap) -> dict[str, Any]:
    """The object that `retime --json` prints; places are those of the score as written."""
    names = [fiber.name for fiber in rig.fibers]
    held, pins = _proven(retiming)
    return {
        "ok": is_good(retiming, checked),
        "keep": retiming.keep,
        "duration_s": retiming.tracks.duration_s,
        "was_s": retiming.was_s,
        "hits_moved": [
            {
                "place": tempo.say_place(hit.was_s),
                "was_s": hit.was_s,
                "now_s": hit.now_s,
                "fibers": [names[f] for f in hit.fibers],
                "line": hit.line,
                "held_by": cause_as_json(cause, names, tempo),
            }
            for hit, cause in zip(retiming.hits_moved, held, strict=True)
        ],
        "leads": [
            {"fiber": names[lead.fiber], "was_s": lead.was_s, "now_s": lead.now_s, "line": lead.line} for lead in retiming.leads
        ],
        "shrunk": [
            {"fiber": names[move.fiber], "place": tempo.say_place(move.was_s), "factor": move.factor, "line": move.line}
            for move in retiming.shrunk
        ],
        "pins_short": [
            {
                "from": tempo.say_place(short.from_s),
                "to": tempo.say_place(short.to_s),
                "short_s": short.short_s,
                "fibers": [names[f] for f in short.fibers],
            }
            for short in retiming.pins_short
        ],
        "cost": _number(retiming.cost),
        "bound": _number(retiming.bound),
        "solve_s": retiming.solve_s,
        "snags_left": [snag_as_json(snag, _teller(retiming, rig, tempo)) for snag in _left(retiming, checked)],
        "stopped": retiming.stopped,
        "pins": [
            {"place": tempo.say_place(at_s), "at_s": at_s, "strokes": pin.force, "says": pin_in_words(pin, at_s, tempo)}
            for pin, at_s in zip(pins, retiming.pins_s.tolist(), strict=False)
        ],
    }


def _proven(retiming: Retiming) -> tuple[list[Cause], list[PinCost]]:
    """What holds each moved hit, and what each pin costs; neither where there is no answer."""
    return (causes(retiming.proof), pin_costs(retiming.proof)) if retiming.proof is not None else ([], [])


def _teller(retiming: Retiming, rig: Rig, tempo: TempoMap) -> Teller:
    """Who tells of snags that are left: at the places of the score as written, where its reader will look."""
    warp = Warp(retiming.warp_was_s, retiming.warp_now_s)
    return Teller(retiming.tracks, rig, lambda at_s: tempo.say_place(warp.was(at_s)))


def _number(value: float) -> float | None:
    return value if math.isfinite(value) else None


def sentences(retiming: Retiming, checked: Check, rig: Rig, tempo: TempoMap) -> list[str]:
    """The report for a person, a line each."""
    names = [fiber.name for fiber in rig.fibers]
    told = [*_short(retiming.pins_short, names, tempo)]
    if not retiming.pins_short:
        held, pins = _proven(retiming)
        told += [_summary(retiming), *_hits(retiming.hits_moved, held, names, tempo), *_leads(retiming, names, tempo)]
        told += [
            pin_in_words(pin, at_s, tempo) for pin, at_s in zip(pins, retiming.pins_s.tolist(), strict=True) if pin.force != 0.0
        ]
    for move in retiming.shrunk:
        told.append(
            f"{names[move.fiber]} goes {move.factor:.3g} of its way in the move that lands at {tempo.say_place(move.was_s)}"
            f"{_line(move.line)}"
        )
    if checked.snags:
        teller = _teller(retiming, rig, tempo)
        what = "Nothing was changed, so these snags are left:" if retiming.pins_short else "What time cannot mend:"
        told.append(what)
        for snag in _left(retiming, checked):
            told.append(f"  {tell(snag, teller).says}")
            # What pins leave no room for is told with the pins.
            told += [] if retiming.pins_short else [f"    {tell(snag, teller).mends}"]
    return told


def _left(retiming: Retiming, checked: Check) -> list[Snag]:
    """The snags that are left; those that time would mend by themselves, but not beside what else must happen, say so."""
    return [replace(snag, mends=retiming.mends(snag)) for snag in checked.snags]


def _summary(retiming: Retiming) -> str:
    if retiming.cost == 0.0 and not retiming.shrunk:
        return "Nothing had to move."
    hits, leads = len(retiming.hits_moved), len(retiming.leads)
    gap = retiming.cost - retiming.bound
    if retiming.stopped:
        told = f"the best known when time was up, at most {gap:.3g} above the least there can be"
        return f"{_count(hits, 'hit')} moved. Cost {retiming.cost:.4g} stroke-seconds, {told}."
    proof = "proven to be the least there is" if gap <= PROVEN * max(1.0, retiming.cost) else (
        f"at most {gap:.3g} above the least there can be"
    )  # fmt: skip
    longer = retiming.tracks.duration_s - retiming.was_s
    length = f" The score lasts {_seconds(longer)} longer." if longer > SAME_S else ""
    if longer < -SAME_S:
        length = f" The score is {_seconds(-longer)} shorter."
    left = f", and {_count(leads, 'move')} {'leaves' if leads == 1 else 'leave'} {_apart(retiming.keep)}" if leads else ""
    return f"{_count(hits, 'hit')} moved{left}. Cost {retiming.cost:.4g} stroke-seconds, {proof}.{length}"


def _apart(keep: str) -> str:
    return "another while before its hit" if keep == "rhythm" else "at another time"


def _hits(hits: Sequence[MovedHit], held: Sequence[Cause], names: list[str], tempo: TempoMap) -> Iterator[str]:
    """One line a hit, with what holds it there; neighbours that moved alike and only keep their rhythm share it."""
    groups: list[tuple[list[MovedHit], Cause]] = []
    for hit, cause in zip(hits, held, strict=True):
        if groups and cause.kind == "rhythm" and abs(_moved(hit) - _moved(groups[-1][0][-1])) < SAME_S:
            groups[-1][0].append(hit)
        else:
            groups.append(([hit], cause))
    for group, cause in groups:
        first, last = group[0], group[-1]
        places = tempo.say_place(first.was_s)
        fibers = list(dict.fromkeys(f for hit in group for f in hit.fibers))
        if len(group) > 1:
            places += f" to {tempo.say_place(last.was_s)} ({len(group)} hits)"
        moved = _moved(first)
        way = "later" if moved > 0.0 else "earlier"
        yield f"  {places}: {_seconds(abs(moved))} {way}, {_fibers(fibers, names)}{_line(first.line)}"
        yield f"    {cause_in_words(cause, names, tempo)}"


def _moved(hit: MovedHit) -> float:
    return hit.now_s - hit.was_s


def _leads(retiming: Retiming, names: list[str], tempo: TempoMap) -> Iterator[str]:
    """One line for all fibers that leave alike."""
    alike: dict[tuple[float, float, int], list[Lead]] = {}
    for lead in retiming.leads:
        alike.setdefault((round(lead.was_s, 6), round(lead.now_s, 6), lead.line), []).append(lead)
    for group in sorted(alike.values(), key=lambda group: group[0].was_s):
        lead = group[0]
        moved = lead.now_s - lead.was_s
        way = "earlier" if moved < 0.0 else "later"
        yield (
            f"  {_fibers([one.fiber for one in group], names)} {'leaves' if len(group) == 1 else 'leave'} "
            f"{_seconds(abs(moved))} {way} than {tempo.say_place(lead.was_s)}{_line(lead.line)}"
        )


def _short(shorts: Sequence[PinsShort], names: list[str], tempo: TempoMap) -> Iterator[str]:
    """What binds between two pins, and what would mend it."""
    for short in shorts:
        begin = "the start of the score" if short.from_s == 0.0 else f"the pin at {tempo.say_place(short.from_s)}"
        lines = ", ".join(str(line) for line in short.lines if line)
        where = f" ({'line' if ',' not in lines else 'lines'} {lines})" if lines else ""
        yield (
            f"Between {begin} and the pin at {tempo.say_place(short.to_s)} {_fibers(short.fibers, names)}{where} "
            f"{'lacks' if len(short.fibers) == 1 else 'lack'} {_seconds(short.short_s)}."
        )
        mend = f"  Move one of the two apart by {_seconds(short.short_s)}, give the pin that much (`within`)"
        if 0.0 < short.factor < 1.0:
            mend += f", or let these moves go {math.floor(short.factor * 1e4) / 1e4:.4g} of their way (--shrink)"
        yield mend + "."


def _seconds(value: float) -> str:
    return f"{value * 1000.0:.3g} ms" if value < 0.0995 else f"{value:.3f} s"


def _count(count: int, noun: str) -> str:
    return f"{count} {noun}{'' if count == 1 else 's'}"


def _fibers(fibers: Sequence[int], names: list[str]) -> str:
    return named([names[f] for f in sorted(fibers)])


def _line(line: int) -> str:
    return f" (line {line})" if line else ""
