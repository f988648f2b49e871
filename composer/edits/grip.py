"""What a knot hangs from: which number of the text gives it its time, and which its strain."""

from dataclasses import dataclass

import numpy as np

from composer.edits.instances import Instances, instances_of
from composer.edits.made import Made
from composer.score.expand_lines import parts, phrase_length
from composer.score.model import Entry, Line, Phrase, Score, Section, Span
from composer.score.spans import Found, Handle, target_handles, time_handles
from composer.tracks import SAME_INSTANT_S, SUDDEN


@dataclass(frozen=True, slots=True)
class Hang:
    """The number that a knot's time hangs from: its handle; the instance's line that is at that instant, by entry (index),
    instance of that entry on this fiber, and place (-1: the instance's start); `edge` "until" or "leaves" of that line; `way`
    1, or -1 where a larger number is an earlier instant; how many times the number counts."""

    handle: Handle
    entry: int
    nth: int
    place: int
    edge: str
    way: int
    times: float


@dataclass(frozen=True, slots=True)
class Grip:
    """A knot that can be taken hold of: fiber, knot (index into the tracks), instant and strain as they are.

    time, target: the spans of the numbers that give it its time and its target; None where it has none of its own
    why_not_time, why_not_target: a sentence where it has none
    players: lines of the entries that move with it
    """

    fiber: int
    knot: int
    at_s: float
    strain: float
    time: Span | None
    target: Span | None
    why_not_time: str
    why_not_target: str
    players: tuple[int, ...]
    hang: Hang | None = None
    reach: Handle | None = None
    scale: float = 1.0


def knot_near(made: Made, fiber: int, seconds: float) -> int:
    """The knot (index into the tracks) of a fiber that is nearest to an instant; of several at one instant the last."""
    tracks = made.tracks
    low, high = int(tracks.first[fiber]), int(tracks.first[fiber + 1])
    times = tracks.time_s[low:high]
    nearest = int(np.argmin(np.abs(times - seconds)))
    return low + int(np.searchsorted(times, times[nearest] + SAME_INSTANT_S, side="right")) - 1


def grip(made: Made, fiber: int, knot: int) -> Grip:
    """What a knot hangs from: what can be dragged, and what moves with it. `knot` is an index into `made.tracks`."""
    tracks = made.tracks
    at_s, strain = float(tracks.time_s[knot]), float(tracks.curve[knot, 0])
    mine = np.zeros(len(made.rig.fibers), dtype=bool)
    mine[fiber] = True
    all_, _ = instances_of(made.score, made.rig, made.abilities, made.tempo, mine)
    row, edge = _row_at(all_, at_s)
    if row is None:
        why = (
            "A sudden move leaves as late as it can: drag where it lands."
            if tracks.manner[knot] == SUDDEN
            else "No line of the score is at this instant."
        )
        return Grip(fiber, knot, at_s, strain, None, None, why, why, ())
    which = int(all_.instance[row])
    entry = all_.entries[int(all_.entry[which])]
    section = next(s for s in made.score.sections if any(one is entry for one in s.entries))
    hang, why_time = _time(made.score, all_, row, edge, section, entry)
    target, why_target = _target(made.score, all_, row, edge)
    phrase = hang is not None and hang.handle.role in ("offset", "over")
    players = _players(made.score, entry.phrase.text) if phrase else _together(section, entry, hang)
    return Grip(
        fiber, knot, at_s, strain, hang.handle.span if hang else None, target.span if target else None, why_time, why_target,
        players, hang, target, float(entry.scale),
    )  # fmt: skip


def _players(score: Score, phrase: str) -> tuple[int, ...]:
    return tuple(e.span.line for s in score.sections for e in s.entries if e.phrase.text == phrase)


def _together(section: Section, entry: Entry, hang: Hang | None) -> tuple[int, ...]:
    if hang is not None and hang.handle.role == "section at":
        return tuple(one.span.line for one in section.entries if one.at is None)
    return (entry.span.line,)


def _row_at(all_: Instances, at_s: float) -> tuple[int | None, str]:
    """The line of an instance that is at an instant, and with which of its edges: where several are, one that lands there,
    the farthest first; then one that leaves there by its `over`, one that is held until there, and the start of an instance."""

    def near(times) -> np.ndarray:
        return np.abs(times - at_s) <= SAME_INSTANT_S

    whole = all_.arrives_s <= all_.stops_s
    lands = np.flatnonzero(all_.goes & whole & near(all_.stops_s))
    if len(lands):
        return int(lands[np.argmax(np.abs(all_.b - all_.a)[lands])]), "lands"
    over = np.array([line.over is not None and line.shape not in ("sudden", "step") for line in all_.written], dtype=bool)
    leaves = np.flatnonzero(near(all_.leaves_s) & over[all_.row]) if len(over) else over
    if len(leaves):
        return int(leaves[-1]), "leaves"
    cut = all_.cut_s[all_.instance]
    held = np.flatnonzero(near(all_.until_s) & (all_.until_s < cut))
    if len(held):
        return int(held[-1]), "until"
    opens = np.flatnonzero((all_.place == 0) & near(all_.start_s[all_.instance]))
    return (int(opens[-1]), "start") if len(opens) else (None, "")


@dataclass(frozen=True, slots=True)
class _Spot:
    """A line as an instance plays it: phrase, the line as written whose way it is, and that (-1: none) which says when and
    where it ends; these are one but in a phrase played backwards."""

    phrase: Phrase
    way: Line | None
    ends: int
    backwards: bool


def _spot(all_: Instances, row: int) -> _Spot:
    which = int(all_.instance[row])
    phrase, back = all_.phrases[int(all_.variant[which])], bool(all_.backwards[which])
    line = all_.written[int(all_.row[row])]
    at = next((n for n, one in enumerate(phrase.lines) if one is line), -1)
    if not back or at < 0:
        return _Spot(phrase, phrase.lines[at] if at >= 0 else None, at, back)
    # Backwards a phrase opens where its last line is, waits there if it is longer, and ends each move at the line before.
    last, length, place = phrase.lines[-1], phrase_length(phrase), int(all_.place[row])
    waits = length is not None and parts(length) != parts(last.offset)
    opening = place == 0 or (place == 1 and waits)
    return _Spot(phrase, None if opening else line, len(phrase.lines) - 1 if opening else at - 1, True)


def _time(score: Score, all_: Instances, row: int, edge: str, section: Section, entry: Entry) -> tuple[Hang | None, str]:
    which = int(all_.instance[row])
    alike = np.flatnonzero(all_.entry == all_.entry[which])
    nth, place = int(np.searchsorted(alike, which)), int(all_.place[row])
    stretch = float(all_.stretch[which])

    def hang(handle: Handle, edge: str, way: int = 1, times: float = 1.0) -> tuple[Hang, str]:
        return Hang(handle, int(all_.entry[which]), nth, place, edge, way, times), ""

    spot = _spot(all_, row)
    first = place == 0 if spot.backwards else spot.ends < 0 or not any(parts(spot.phrase.lines[spot.ends].offset))
    if edge == "start" or (first and edge != "leaves"):
        own = {handle.role: handle for handle in time_handles(Found(section, entry, spot.phrase, None))}
        return hang(next(own[role] for role in ("at", "after", "section at") if role in own), "start")
    if spot.phrase.span.file != score.file:
        return None, _elsewhere(spot.phrase)
    if spot.way is not None:
        handles = {handle.role: handle for handle in time_handles(Found(section, entry, spot.phrase, spot.way))}
        if edge == "leaves":
            return hang(handles["over"], "leaves", -1, stretch)
        if spot.backwards and edge == "lands" and "over" in handles and spot.way.shape not in ("sudden", "step"):
            return hang(handles["over"], "lands", 1, stretch)
    if spot.backwards and spot.ends == 0:
        return None, "The end of a phrase that is played backwards is as far off as the phrase is long."
    line = spot.phrase.lines[spot.ends]
    offset = next(h for h in time_handles(Found(section, entry, spot.phrase, line)) if h.role == "offset")
    return hang(offset, "until", -1 if spot.backwards else 1, stretch)


def _elsewhere(phrase: Phrase) -> str:
    return f"This line stands in {phrase.span.file}: change it there, or copy the phrase for this entry."


def _target(score: Score, all_: Instances, row: int, edge: str) -> tuple[Handle | None, str]:
    """The target that gives a knot its strain: of the line that lands there, or of the last before it that goes anywhere."""
    spot = _spot(all_, row)
    taken = "It starts from where the fiber is then, which what comes before decides."
    at = spot.ends
    if edge == "start" or at < 0:
        return None, taken
    if edge == "leaves":
        at += 1 if spot.backwards else -1
    while at >= 0 and spot.phrase.lines[at].target.unit == "hold":
        at -= 1
    if at < 0:
        return None, taken
    line = spot.phrase.lines[at]
    if line.span.file != score.file:
        return None, _elsewhere(spot.phrase)
    entry = all_.entries[int(all_.entry[int(all_.instance[row])])]
    found = target_handles(Found(None, entry, spot.phrase, line))
    return next(handle for handle in found if handle.role == "target"), ""
