"""The retiming taken into the text: numbers rewritten such that the text expands to the retimed times."""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from composer.edits.edit import Edit, Refusal, apply, edit_of
from composer.edits.instances import Instances, instances_of
from composer.edits.made import Made, Remake
from composer.edits.rewriting import Plan, Rewriting
from composer.edits.wanted import Wanted, chosen_times, wanted
from composer.faults import Faults
from composer.motion import strain_at
from composer.report.sentences import named
from composer.retime.apply import retimed
from composer.retime.events import with_waits
from composer.retime.retiming import Retiming
from composer.tracks import HOLD, SAME_INSTANT_S, Tracks, fiber_of

Array = NDArray[np.float64]

CLOSE_S = 1e-6
"""Seconds to which the text as edited is where the retiming is, where numbers can say it."""

CLOSE_STRAIN = 1e-5
"""Strain to which the edited text moves as the retiming does, between its knots: a microsecond of the fastest move."""

ROUNDS = 4
"""Ways of writing, each plainer than the one before: numbers, plain entries, move by move."""


@dataclass(frozen=True, slots=True, eq=False)
class Taken:
    """The edit that takes a retiming in, and what comes of it.

    after: what follows from the edited text; off_s: the most by which one of its knots misses its retimed instant, in s
    notes: sentences on what could not be said by rewriting numbers, and what was written instead
    """

    edit: Edit
    after: Made
    off_s: float
    notes: tuple[str, ...]


def _said(made: Made, from_s: float, to_s: float) -> str:
    """What is taken in, in words."""
    last = float(made.tracks.duration_s)
    if from_s <= 0.0 and to_s >= last:
        return "the retiming"
    begins, ends = (made.tempo.say_place(min(max(one, 0.0), last)) for one in (from_s, to_s))
    return f"the retiming at {begins}" if begins == ends else f"the retiming from {begins} to {ends}"


def take(
    text: str, made: Made, retiming: Retiming, remake: Remake, from_s: float = 0.0, to_s: float = float("inf")
) -> Taken | Refusal:
    """The retiming of `made.tracks` taken into the text, where instants as written lie from `from_s` to `to_s`: all, a
    passage, or one hit (both its instant). Takes a while: for a worker."""
    proof = retiming.proof
    if proof is None:
        return Refusal("The pins are too close, so there is no retiming to take in.")
    if retiming.shrunk:
        return Refusal("This retiming shrinks moves: take in one that only moves them, or shrink the moves in the text first.")
    times = chosen_times(proof, from_s, to_s)
    if np.abs(times - proof.tracks.time_s).max(initial=0.0) <= SAME_INSTANT_S:
        return Refusal("The retiming moves nothing there.")
    aim = replace(proof.tracks, time_s=times, duration_s=max(retiming.tracks.duration_s, float(times.max(initial=0.0))))
    if _runs_back(aim):
        return Refusal("What moves there would run into what does not: take a longer passage in.")
    aim = retimed(proof.tracks, with_waits(made.tracks)[1], times, aim.duration_s)
    all_, faults = instances_of(made.score, made.rig, made.abilities, made.tempo)
    if faults:
        return Refusal(f"{faults[0].found[:1].upper()}{faults[0].found[1:]}.")
    new = wanted(all_, proof.tracks, times)
    changed = _changed(all_, new)
    plan = Plan()
    plan.flat |= set(all_.fiber[new.bent].tolist())
    said = _said(made, from_s, to_s)
    why = "The retiming cannot be said in the text."
    for _ in range(ROUNDS):
        changes, notes = Rewriting(text, made, all_, new, aim, plan).changes_and_notes()
        edit = edit_of(changes, f"{said} taken in")
        try:
            after = remake(apply(text, edit))
        except Faults as wrong:
            fault = wrong.faults[0]
            why = f"The text would not be one that can be played: line {fault.where.line}, {fault.found}."
            off, wrong_ones = np.inf, np.flatnonzero(_moved_fibers(proof.tracks, times))
        else:
            by_fiber = _off(aim, after.tracks)
            elsewhere = _apart(aim, after.tracks, made) > CLOSE_STRAIN
            off, wrong_ones = float(by_fiber.max(initial=0.0)), np.flatnonzero((by_fiber > CLOSE_S) | elsewhere)
            if not len(wrong_ones):
                return Taken(edit, after, off, notes)
        touched = {int(n) for n in np.unique(all_.entry[np.isin(all_.fiber, wrong_ones) & changed])}
        if not touched <= plan.plain:
            plan.plain |= touched
        else:
            plan.flat |= {int(f) for f in wrong_ones}
    if np.isinf(off):
        return Refusal(why)
    who = named([made.rig.fibers[f].name for f in wrong_ones])
    return Taken(edit, after, off, (*notes, f"{who}: up to {off * 1e3:.3g} ms off, as nearly as it can be written."))


def _changed(all_: Instances, new: Wanted) -> NDArray[np.bool_]:
    """(N,) which instances are to be elsewhere, in part at least."""
    changed = np.abs(new.start_s - all_.start_s) > SAME_INSTANT_S
    rows = (np.abs(new.until_s - all_.until_s) > SAME_INSTANT_S) | (
        all_.goes & (np.abs(new.leaves_s - all_.leaves_s) > SAME_INSTANT_S)
    )
    changed[all_.instance[rows]] = True
    return changed


def _runs_back(aim: Tracks) -> bool:
    """Whether some knot would come before the one before it on its fiber."""
    falls = np.diff(aim.time_s) < -SAME_INSTANT_S
    falls[aim.first[1:-1] - 1] = False
    return bool(falls.any())


def _moved_fibers(tracks: Tracks, times: Array) -> NDArray[np.bool_]:
    moved = np.zeros(tracks.fibers, dtype=bool)
    moved[fiber_of(tracks)[np.abs(times - tracks.time_s) > SAME_INSTANT_S]] = True
    return moved


def _off(aim: Tracks, got: Tracks) -> Array:
    """(F,) the most by which a begin or an end of a move of one misses the nearest of the other, in s."""
    off = np.zeros(aim.fibers)
    for fiber in range(aim.fibers):
        ours, theirs = _instants(aim, fiber), _instants(got, fiber)
        if not len(ours) or not len(theirs):
            off[fiber] = 0.0 if len(ours) == len(theirs) else np.inf
            continue
        off[fiber] = max(_farthest(ours, theirs), _farthest(theirs, ours))
    return off


def _apart(aim: Tracks, got: Tracks, made: Made) -> Array:
    """(F,) the most by which strains differ between knots of either, each fiber at times of its own."""
    own = []
    for fiber in range(aim.fibers):
        knots = [one.time_s[one.first[fiber] : one.first[fiber + 1]] for one in (aim, got)]
        both = np.unique(np.concatenate([*knots, [max(aim.duration_s, got.duration_s) + 1.0]]))
        gaps = np.diff(both)
        wide = np.flatnonzero(gaps > 10.0 * CLOSE_S)
        own.append((both[wide, None] + gaps[wide, None] * [0.3, 0.7]).ravel())
    most = max((len(one) for one in own), default=0)
    if not most:
        return np.zeros(aim.fibers)
    times = np.array([np.pad(one, (0, most - len(one)), mode="edge") if len(one) else np.zeros(most) for one in own])
    return np.abs(strain_at(aim, made.abilities, times) - strain_at(got, made.abilities, times)).max(axis=1)


def _instants(tracks: Tracks, fiber: int) -> Array:
    low, high = int(tracks.first[fiber]), int(tracks.first[fiber + 1])
    # What quivers in place is a move of a constant curve, and may be cut anywhere.
    goes = (tracks.manner[low : high - 1] != HOLD) & np.any(tracks.curve[low : high - 1, 1:] != 0.0, axis=1)
    moves = low + np.flatnonzero(goes)
    return np.unique(np.concatenate([tracks.time_s[moves], tracks.time_s[moves + 1]]))


def _farthest(some: Array, others: Array) -> float:
    """The farthest that one of some instants is from the nearest of others, both rising."""
    at = np.searchsorted(others, some)
    before, after = others[np.maximum(at - 1, 0)], others[np.minimum(at, len(others) - 1)]
    return float(np.minimum(np.abs(some - before), np.abs(some - after)).max())
