"""A knot of a strand, or a hit of the cloth, dragged: one number of the text rewritten in the form it was written in."""

from fractions import Fraction

import numpy as np

from composer.edits.copying import copy_for_this_one
from composer.edits.edit import Edit, Moves, Refusal, change_at, edit_of
from composer.edits.grids import GRIDS
from composer.edits.grip import Grip, Hang, grip, knot_near
from composer.edits.instances import Instances, instances_of
from composer.edits.made import Made
from composer.edits.respell import respelled
from composer.edits.values import counts_from_place, moved_by, per_strain, place_of, snapped, target_on_steps
from composer.faults import Fault
from composer.score.model import Score
from composer.score.numbers import write_like, write_place_like
from composer.score.spans import Handle, text_at
from composer.tracks import SAME_INSTANT_S

MOST_LIT = 200_000
"""Up to so many segments all fibers are worked out while one is dragged; beyond, the one that is dragged alone."""

TRIES = 4
"""Corrections of a number whose effect is no straight line, across a change of tempo."""


def drag(
    text: str,
    made: Made,
    held: Grip,
    time_s: float | None = None,
    strain: float | None = None,
    grid: Fraction = Fraction(1, 4),
    free: bool = False,
) -> Edit | Refusal:
    """A knot dragged to an instant, to a strain, or both (then two numbers): each number rewritten in its own form.

    grid: counts to whose multiples times snap, unless `free`. `made` is what follows from `text` as it stands.
    """
    new: list[tuple[Handle, str]] = []
    if time_s is not None:
        if held.hang is None:
            return Refusal(held.why_not_time)
        new.append((held.hang.handle, _at_time(text, made, held, held.hang, time_s, grid, free)))
    if strain is not None:
        if held.reach is None:
            return Refusal(held.why_not_target)
        wanted = _at_strain(text, made, held, held.reach, strain, free)
        if isinstance(wanted, Refusal):
            return wanted
        new.append((held.reach, wanted))
    return rewritten(text, made, new, held.fiber)


def rewritten(text: str, made: Made, new: list[tuple[Handle, str]], fiber: int | None = None) -> Edit | Refusal:
    """Numbers of the text rewritten, with what that moves; refused, with the reason, where the score could not be played.

    fiber: the one to look at where there are too many to look at all
    """
    score, faults = _respelled(text, made.score, new)
    told = Refusal("The line could not be read then.")
    if score is None or faults:
        return Refusal(_because(faults[0])) if faults else told
    few = len(made.tracks.time_s) <= MOST_LIT or fiber is None
    mine = None if few else np.arange(len(made.rig.fibers)) == fiber
    before, _ = instances_of(made.score, made.rig, made.abilities, made.tempo, mine)
    after, faults = instances_of(score, made.rig, made.abilities, made.tempo, mine)
    if faults:
        return Refusal(_because(faults[0]))
    changes = [change_at(text, handle.span, word) for handle, word in new if text_at(text, handle.span) != word]
    if not changes:
        return edit_of((), "Nothing moved.")
    moves = _moves(before, after)
    said = ", ".join(f"{_role(handle)} {text_at(text, handle.span)} to {word}" for handle, word in new)
    places = len(moves.places_s)
    line = new[0][0].span.line
    return edit_of(changes, f"{said} (line {line}" + (f", in {places} places)" if places > 1 else ")"), moves)


def drag_hit(
    text: str, made: Made, was_s: float, time_s: float, fiber: int, grid: Fraction = Fraction(1, 4), free: bool = False
) -> Edit | Refusal:
    """A hit of the cloth dragged from one instant to another, by the fiber under the pointer."""
    return drag(text, made, grip(made, fiber, knot_near(made, fiber, was_s)), time_s, None, grid, free)


def _because(fault: Fault) -> str:
    said = fault.found[:1].upper() + fault.found[1:]
    return said + (f"; expected {fault.expected}." if fault.expected else ".")


def _role(handle: Handle) -> str:
    return {"section at": "section"}.get(handle.role, handle.role)


def _respelled(text: str, score: Score, new: list[tuple[Handle, str]]) -> tuple[Score | None, list[Fault]]:
    """The score with numbers rewritten; its lines are those of the text, so that spans hold."""
    by_line: dict[int, list[tuple[Handle, str]]] = {}
    for handle, word in new:
        by_line.setdefault(handle.span.line, []).append((handle, word))
    for number, words in by_line.items():
        line = score.lines[score.file][number - 1]
        for handle, word in sorted(words, key=lambda one: one[0].span.column, reverse=True):
            line = line[: handle.span.column - 1] + word + line[handle.span.end - 1 :]
        found = respelled(score, number, line)
        if found is None:
            return None, []
        score, faults = found
        if faults:
            return score, faults
    return score, []


def _word(text: str, handle: Handle, value: Fraction, made: Made) -> str:
    """The text of a handle's number with another value; that of a place is given in counts from the score's start."""
    old = text_at(text, handle.span)
    if handle.unit == "place":
        return write_place_like(old, *place_of(value, made.tempo))
    return write_like(old, value)


def _at_time(text: str, made: Made, held: Grip, hang: Hang, time_s: float, grid: Fraction, free: bool) -> str:
    """The number with which the knot lands at an instant, as nearly as grid and form allow."""
    handle, tempo = hang.handle, made.tempo
    old = counts_from_place(handle, tempo) if handle.unit == "place" else handle.value
    mine = np.arange(len(made.rig.fibers)) == held.fiber
    value, at_s = float(old), held.at_s
    for _ in range(TRIES):
        value += hang.way * moved_by(handle, at_s, time_s, tempo) / hang.times
        score, faults = _respelled(text, made.score, [(handle, _exact(text, handle, value, made))])
        if score is None or faults:
            break
        at_s = _instant(instances_of(score, made.rig, made.abilities, tempo, mine)[0], hang)
        if at_s is None or abs(at_s - time_s) <= SAME_INSTANT_S:
            break
    return _word(text, handle, snapped(handle, text_at(text, handle.span), value, time_s, grid, free, tempo), made)


def _exact(text: str, handle: Handle, value: float, made: Made) -> str:
    """A number as exactly as a float is, in whatever form."""
    exact = Fraction(value)
    if handle.unit == "place":
        bar, count = place_of(exact, made.tempo)
        return f"{bar}:{float(count):.12f}"
    suffix = "" if handle.unit == "counts" else handle.unit
    return f"{value:.12f}{suffix}"


def _instant(all_: Instances, hang: Hang) -> float | None:
    """The instant of what a hang names, in other instances of the same fiber."""
    alike = np.flatnonzero(all_.entry == hang.entry)
    if hang.nth >= len(alike):
        return None
    which = alike[hang.nth]
    if hang.edge == "start":
        return float(all_.start_s[which])
    row = np.flatnonzero((all_.instance == which) & (all_.place == hang.place))
    if not len(row):
        return None
    return float({"leaves": all_.leaves_s, "lands": all_.arrives_s, "until": all_.until_s}[hang.edge][row[0]])


def _at_strain(text: str, made: Made, held: Grip, handle: Handle, strain: float, free: bool) -> str | Refusal:
    """The target with which a knot has a strain; in a sum of entries the one that is dragged makes up the difference."""
    if held.scale == 0.0:
        return Refusal("The entry is scaled by 0: its targets reach nothing.")
    per = per_strain(handle.unit, held.fiber, made.abilities) / held.scale
    # A `hold` has no number of its own: it gets the whole strain.
    value = strain * per if handle.unit == "hold" else float(handle.value) + (strain - held.strain) * per
    old = text_at(text, handle.span)
    return write_like(old, target_on_steps(handle.unit, old, max(0.0, value), free))


def _moves(before: Instances, after: Instances) -> Moves:
    """What differs between the instances of a score and those of the same score with other numbers."""
    keys = [_keys(one) for one in (before, after)]
    _, old, new = np.intersect1d(*keys, assume_unique=True, return_indices=True)
    ends = [np.where(one.goes, one.stops_s, one.until_s) for one in (before, after)]
    differs = (
        (np.abs(before.leaves_s[old] - after.leaves_s[new]) > SAME_INSTANT_S)
        | (np.abs(ends[0][old] - ends[1][new]) > SAME_INSTANT_S)
        | (np.abs(before.b[old] - after.b[new]) > 1e-12)
    )
    old, new = old[differs], new[differs]
    which = after.instance[new]
    lit = np.unique(which)
    # A place a repeat of an entry: where the first of its fibers starts.
    nth = _nth(after)
    place = np.lexsort((after.start_s[lit], nth[lit], after.entry[lit]))
    lit = lit[place]
    first = np.ones(len(lit), dtype=bool)
    first[1:] = (np.diff(after.entry[lit]) != 0) | (np.diff(nth[lit]) != 0)
    return Moves(
        fiber=after.fiber[which],
        entry=after.entry_line[which],
        line=after.line[new],
        from_s=after.leaves_s[new],
        to_s=ends[1][new],
        was_from_s=before.leaves_s[old],
        was_to_s=ends[0][old],
        places_s=after.start_s[lit[first]],
    )


def _nth(all_: Instances) -> np.ndarray:
    """(N,) which repeat of its entry each instance is, by its fiber."""
    order = np.lexsort((all_.start_s, all_.fiber, all_.entry))
    new = np.ones(len(order), dtype=bool)
    new[1:] = (np.diff(all_.entry[order]) != 0) | (np.diff(all_.fiber[order]) != 0)
    at = np.arange(len(order))
    nth = np.empty(len(order), dtype=np.int64)
    nth[order] = at - np.maximum.accumulate(np.where(new, at, 0))
    return nth


def _keys(all_: Instances) -> np.ndarray:
    """(M,) a number for each line of each instance that is the same whatever the times."""
    which = all_.instance
    nth = _nth(all_)
    fibers, repeats = int(all_.fiber.max(initial=0)) + 1, 1 << 20
    wide = 2 + max((len(phrase.lines) for phrase in all_.phrases), default=0)
    return ((all_.entry[which] * fibers + all_.fiber[which]) * repeats + nth[which]) * wide + all_.place


__all__ = ["GRIDS", "Grip", "copy_for_this_one", "drag", "drag_hit", "grip", "knot_near", "rewritten"]
