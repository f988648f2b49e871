"""The report of a check: JSON for machines, and a list for the composer."""

from collections.abc import Iterable
from typing import Any

import numpy as np

from composer.limits.check import Check
from composer.limits.snag import Snag
from composer.report.sentences import Teller, named, place_in_words, tell
from composer.tracks import HOLD, SAME_INSTANT_S, Tracks, durations, fiber_of

MOST_TOLD = 60
"""Snags that the list for people tells; the rest are counted, and all are in the JSON."""


def as_json(score: str, checked: Check, teller: Teller, notes: Iterable[str] = ()) -> dict[str, Any]:
    """The object of `check --json`: plain numbers, strings, lists, never a NaN or an infinity.

    phrase_line (the line of the phrase in the score, 0 where it has none), mends (whether time alone can) and mend (a
    sentence) are beside the keys that say what is wrong; notes are sentences about what is no snag.
    """
    tracks, rig = teller.tracks, teller.rig
    return {
        "score": score,
        "rig": rig.file,
        "ok": checked.ok,
        "duration_s": tracks.duration_s,
        "fibers": tracks.fibers,
        "moves": tracks.moves,
        "snags": [snag_as_json(snag, teller) for snag in checked.snags],
        "air": {"lowest_kPa": checked.lowest_kPa, "used_L": checked.used_L},
        "duty": {
            "highest": checked.duty_highest,
            "fiber": None if checked.duty_fiber is None else rig.fibers[checked.duty_fiber].name,
        },
        "notes": list(notes),
    }


def snag_as_json(snag: Snag, teller: Teller) -> dict[str, Any]:
    """One snag of `check --json`."""
    told = tell(snag, teller)
    return {
        "kind": snag.kind,
        "fiber": None if snag.fiber is None else teller.rig.fibers[snag.fiber].name,
        "from_s": snag.from_s,
        "to_s": snag.to_s,
        "place": teller.say_place(snag.from_s),
        "needs": snag.needs,
        "has": snag.has,
        "unit": snag.unit,
        "line": snag.line,
        "say": told.says,
        "phrase_line": _phrase_line(snag, teller.tracks),
        "mends": snag.mends,
        "mend": told.mends,
    }


def as_text(score: str, checked: Check, teller: Teller, notes: Iterable[str] = ()) -> str:
    """The list for the composer: a summary, then what is wrong, latest in the score first, each with what would mend it.

    Fibers that are asked for the same at the same place by the same line are told together.
    """
    tracks, rig = teller.tracks, teller.rig
    count = len(checked.snags)
    lines = [
        f"{score}: {_counted(tracks.fibers, 'fiber')} of {rig.name}, {_counted(tracks.moves, 'move')}, "
        f"{minutes(tracks.duration_s)}: " + ("the rig can do all of it" if not count else f"{_counted(count, 'snag')}")
    ]
    places = together(checked.snags, tracks)
    for snag, fibers in places[:MOST_TOLD]:
        words = tell(snag, teller, fibers)
        lines.append(f"{score}:{snag.line}: {words.says}" if snag.line else f"{score}: {words.says}")
        lines.append(f"   {words.mends}" + _by_phrase(snag, tracks))
    if len(places) > MOST_TOLD:
        lines.append(f"and {len(places) - MOST_TOLD} more earlier in the score; --json lists them all")
    lines += [f"{score}: {note}" for note in notes]
    full = round(checked.lowest_kPa) >= round(rig.supply.max_receiver_kPa)
    lines.append(
        f"air: {checked.used_L:.1f} L in all, the receiver {'stays at' if full else 'falls to'} {checked.lowest_kPa:.0f} kPa "
        f"({rig.supply.min_pressure_kPa:.0f} kPa is the least)"
    )
    if checked.duty_fiber is not None:
        name = rig.fibers[checked.duty_fiber].name
        lines.append(f"coils: {name} is on the most, for {100.0 * checked.duty_highest:.0f} % of the score")
    return "\n".join(lines)


def waiting_notes(cues: Iterable[Any], teller: Teller) -> list[str]:
    """A sentence for each waiting cue (name, seconds, wait) at which something is moving: it would stop in mid-move."""
    tracks = teller.tracks
    lasts, fiber = durations(tracks), fiber_of(tracks)
    moving = tracks.manner != HOLD
    notes = []
    for cue in cues:
        if not cue.wait:
            continue
        under_way = moving & (tracks.time_s < cue.seconds - SAME_INSTANT_S)
        under_way &= tracks.time_s + lasts > cue.seconds + SAME_INSTANT_S
        who = np.unique(fiber[under_way])
        if len(who):
            names = named([teller.rig.fibers[f].name for f in who])
            place = place_in_words(teller.say_place(cue.seconds))
            notes.append(f'the cue "{cue.name}" waits at {place} while {names} {"is" if len(who) == 1 else "are"} moving')
    return notes


def minutes(seconds: float) -> str:
    """A length of time as people say it: "61.5 s", "3:36.2 min"."""
    if seconds < 100.0:
        return f"{seconds:.1f} s"
    whole, tenths = divmod(round(seconds * 10.0), 600)
    return f"{whole}:{tenths / 10.0:04.1f} min"


def _counted(count: int, what: str) -> str:
    return f"{count} {what}" if count == 1 else f"{count} {what}s"


def _phrase_line(snag: Snag, tracks: Tracks) -> int:
    return int(tracks.phrase_line[snag.knot]) if snag.knot >= 0 else 0


def _by_phrase(snag: Snag, tracks: Tracks) -> str:
    line = _phrase_line(snag, tracks)
    return f" (Its phrase: line {line}.)" if line else ""


def together(snags: Iterable[Snag], tracks: Tracks) -> list[tuple[Snag, list[int]]]:
    """Snags that a sentence tells alike but for the fiber, as one with all their fibers; the latest first.

    Two stretches of one move are one to a reader: so what counts is when the move starts, where there is one.
    """
    groups = [(alike[0], fibers_of(alike)) for alike in alike_but_for_the_fiber(snags, tracks)]
    return sorted(groups, key=lambda group: -group[0].from_s)


def fibers_of(snags: Iterable[Snag]) -> list[int]:
    """The fibers of some snags, each once, in the order in which they come."""
    return list(dict.fromkeys(snag.fiber for snag in snags if snag.fiber is not None))


def alike_but_for_the_fiber(snags: Iterable[Snag], tracks: Tracks) -> list[list[Snag]]:
    """Snags in groups that one sentence tells, in the order in which the first of each comes."""
    groups: dict[tuple, list[Snag]] = {}
    for snag in snags:
        start = snag.from_s if snag.kind in ("hold", "duty", "air") else float(tracks.time_s[snag.knot])
        asked = (round(start, 6), float(f"{snag.needs:.6g}"), float(f"{snag.has:.6g}"))
        groups.setdefault((snag.kind, snag.line, _phrase_line(snag, tracks), *asked), []).append(snag)
    return list(groups.values())
