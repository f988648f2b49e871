"""What would mend a snag, each as an edit of the text that has been tried: only what really helps is offered."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from composer.edits.edit import Edit, Refusal, apply
from composer.edits.made import Made, Remake
from composer.edits.mend_edits import Spot, ask_less, give_time, let_lead, no_step, pin_here, quiver_less, spot_of
from composer.edits.taking import take
from composer.faults import Faults
from composer.limits.check import Check, check
from composer.limits.snag import Snag
from composer.retime.programme import Unsolved
from composer.retime.retiming import Retiming
from composer.retime.whole_score import retime_score
from composer.score.model import Entry
from composer.tracks import HOLD, STEP, Tracks, fiber_of

WAYS = ("time", "lead", "shrink", "air", "retime", "pin")
"""Give it time, let it lead, shrink it, ask less of the air, let the retimer do this hit, pin this."""

TRIES = 5
"""How often more is asked for where a first amount does not do."""

MORE = 1.0 + 1e-6
"""A little more time than is needed, so that rounding cannot make it short."""


@dataclass(frozen=True, slots=True, eq=False)
class Choice:
    """A way to mend a snag: `way` one of WAYS, the words for its button, the edit, what follows from the edited text, the
    tracks to show as a ghost, and how many snags are left in the text then (for a pin: in its retiming)."""

    way: str
    say: str
    edit: Edit
    after: Made
    ghost: Tracks
    snags_left: int


@dataclass(frozen=True, slots=True, eq=False)
class Mending:
    """The choices for a snag, and for each way that does not help a sentence why not, by way."""

    choices: tuple[Choice, ...]
    not_these: dict[str, str]


@dataclass(frozen=True, slots=True, eq=False)
class _Case:
    """A snag with all that is known when it is to be mended."""

    text: str
    made: Made
    snag: Snag
    checked: Check
    remake: Remake
    retiming: Retiming | None
    spot: Spot | None


def mends(text: str, made: Made, snag: Snag, checked: Check, remake: Remake, retiming: Retiming | None = None) -> Mending:
    """What would mend a snag of `checked`, each tried by expanding and checking the edited text. Takes a while: for a worker.

    retiming: of `made.tracks` where there is one; without it nothing is offered that needs one.
    """
    choices: list[Choice] = []
    not_these: dict[str, str] = {}
    for way, found in each_mend(text, made, snag, checked, remake, retiming):
        if isinstance(found, Choice):
            choices.append(found)
        else:
            not_these[way] = found.say
    return Mending(tuple(choices), not_these)


def each_mend(
    text: str, made: Made, snag: Snag, checked: Check, remake: Remake, retiming: Retiming | None = None
) -> Iterator[tuple[str, Choice | Refusal]]:
    """As `mends`, one way after another as it has been tried: for a window that shows each when it is there."""
    spot = None if snag.fiber is None or snag.knot < 0 else spot_of(made, snag.fiber, snag.knot)
    case = _Case(text, made, snag, checked, remake, retiming, spot)
    for way in _FOR.get(snag.kind, ()):
        yield way, _WAYS[way](case)


def _tried(case: _Case, way: str, say: str, edits: Iterator[Edit | Refusal], known: Made | None = None) -> Choice | Refusal:
    """The first of some edits that mends the snag without making another; else why the last one does not.

    known: what follows from the first edit, where that has been worked out
    """
    why = Refusal("Nothing of the kind would mend it.")
    for edit in edits:
        if isinstance(edit, Refusal):
            return why if why.say.startswith("It") else edit
        try:
            after = known or case.remake(apply(case.text, edit))
        except Faults as wrong:
            said = wrong.faults[0].found
            why = Refusal(f"{said[:1].upper()}{said[1:]}.")
            continue
        left = check(after.tracks, after.rig, after.abilities).snags
        if _still(case.snag, left):
            why = Refusal("It would not be enough: the snag is still there.")
        elif len(left) >= len(case.checked.snags):
            new = len(left) - len(case.checked.snags) + 1
            why = Refusal(f"It would make {new} other snag{'' if new == 1 else 's'} in its place.")
        else:
            return Choice(way, f"{say}: {edit.say}", edit, after, after.tracks, len(left))
    return why


def _still(snag: Snag, left: tuple[Snag, ...]) -> bool:
    """Whether a snag of the kind is still there, on that fiber and then."""
    return any(
        one.kind == snag.kind and one.fiber == snag.fiber and one.from_s < snag.to_s + 1e-6 and one.to_s > snag.from_s - 1e-6
        for one in left
    )


def _lacking(case: _Case) -> float:
    """Seconds that the move lacks, the most of all fibers that make it from the same lines."""
    tracks, snag, most = case.made.tracks, case.snag, 0.0
    ends = case.made.tracks.first[1:]
    for one in case.checked.snags:
        alike = one.kind == snag.kind and one.knot >= 0 and one.fiber is not None
        if not alike or tracks.line[one.knot] != tracks.line[snag.knot] or (
            tracks.phrase_line[one.knot] != tracks.phrase_line[snag.knot]
        ):  # fmt: skip
            continue
        if one.knot + 1 >= ends[one.fiber]:
            continue
        lasts = float(tracks.time_s[one.knot + 1] - tracks.time_s[one.knot])
        ratio = one.needs / one.has if one.has > 0.0 else np.inf
        needs = lasts * (np.sqrt(ratio) if one.kind == "accel" else ratio)
        most = max(most, float(needs - lasts))
    return most * MORE


def _more(case: _Case, make: Callable[[str, Made, Spot, float], Edit | Refusal]) -> Iterator[Edit | Refusal]:
    lacking = _lacking(case)
    if case.spot is None or not np.isfinite(lacking) or lacking <= 0.0:
        yield Refusal("No single move is to blame that could be given time.")
        return
    for n in range(TRIES):
        yield make(case.text, case.made, case.spot, lacking * (1.0 + 0.15 * n))


def _time(case: _Case) -> Choice | Refusal:
    knot = case.snag.knot
    if knot >= 0 and case.made.tracks.manner[knot] == STEP and case.spot is not None:
        return _tried(case, "time", "Give it time", iter([no_step(case.text, case.made, case.spot)]))
    if not case.snag.mends:
        return Refusal("No amount of time mends it.")
    return _tried(case, "time", "Give it time", _more(case, give_time))


def _lead(case: _Case) -> Choice | Refusal:
    if not case.snag.mends:
        return Refusal("No amount of time mends it.")
    return _tried(case, "lead", "Let it lead", _more(case, let_lead))


def _shrink(case: _Case) -> Choice | Refusal:
    snag, tracks = case.snag, case.made.tracks
    entry = _entry(case.made, snag.line)
    if entry is None:
        return Refusal("It comes from no entry of this score.")
    share = snag.has / snag.needs if snag.needs > 0.0 else 0.0
    if snag.kind in ("stroke", "hold") and snag.needs <= 0.0:
        return Refusal("Less of it would not lift it above rest: let what is added under it ask for less.")
    if snag.kind == "hold":
        mine = slice(int(tracks.first[snag.fiber]), int(tracks.first[snag.fiber + 1]))
        within = (tracks.time_s[mine] >= snag.from_s - 1e-6) & (tracks.time_s[mine] <= snag.to_s + 1e-6)
        peak = float(tracks.curve[mine].sum(axis=1)[within].max(initial=0.0))
        share = 0.5 * float(case.made.abilities.stroke[snag.fiber]) / peak if peak > 0.0 else 0.0
    if snag.kind == "accel" or (not snag.mends and snag.kind == "rate" and case.spot is not None):
        quivers = case.spot is not None and case.spot.phrase.lines[case.spot.at].quiver is not None
        if quivers:
            return _tried(
                case, "shrink", "Quiver less",
                (quiver_less(case.text, case.made, case.spot, share * (1.0 - 0.1 * n)) for n in range(TRIES)),
            )  # fmt: skip
    alike = [one for one in case.checked.snags if one.line == snag.line and one.kind == snag.kind and one.needs > 0.0]
    worst = min([one.has / one.needs for one in alike], default=share)
    share = share if snag.kind == "hold" else min(share, worst)
    edits = (ask_less(case.text, case.made, [entry], share * (1.0 - 0.08 * n)) for n in range(TRIES))
    return _tried(case, "shrink", "Shrink it", edits)


def _air(case: _Case) -> Choice | Refusal:
    snag, tracks = case.snag, case.made.tracks
    fills = (tracks.manner != HOLD) & (tracks.curve[:, 1:].sum(axis=1) > 0.0)
    ends = np.append(tracks.time_s[1:], np.inf)
    within = fills & (tracks.time_s < snag.to_s) & (ends > snag.from_s) & (fiber_of(tracks) >= 0)
    entries = [one for line in np.unique(tracks.line[within]).tolist() if (one := _entry(case.made, line)) is not None]
    if not entries:
        return Refusal("No entry of this score draws air there.")
    share = snag.has / snag.needs
    edits = (ask_less(case.text, case.made, entries, share * (1.0 - 0.06 * n)) for n in range(2 * TRIES))
    return _tried(case, "air", "Ask less of the air", edits)


def _entry(made: Made, line: int) -> Entry | None:
    return next((e for s in made.score.sections for e in s.entries if e.span.line == line), None)


def _span(case: _Case) -> tuple[float, float]:
    """The instants that the retimer is to do for a snag: where its move lands; for a stretch, all of it."""
    snag, tracks = case.snag, case.made.tracks
    if snag.kind in ("rate", "accel", "switching") and snag.knot >= 0 and snag.knot + 1 < len(tracks.time_s):
        end = float(tracks.time_s[snag.knot + 1])
        return end, end
    return snag.from_s, snag.to_s


def _retime(case: _Case) -> Choice | Refusal:
    if case.retiming is None:
        return Refusal("There is no retiming yet.")
    from_s, to_s = _span(case)
    tracks = case.made.tracks
    last = float(tracks.time_s.max(initial=0.0))
    why = Refusal("The retiming does nothing there.")
    # Wider where what moves there leans on what comes after it.
    for wide in (0.0, 2.0, 8.0, last):
        found = take(case.text, case.made, case.retiming, case.remake, from_s - wide, to_s + wide)
        if isinstance(found, Refusal):
            why = found
            continue
        tried = _tried(case, "retime", "Let the retimer do this hit", iter([found.edit]), found.after)
        if isinstance(tried, Choice):
            return tried
        why = tried
    return why


def _pin(case: _Case) -> Choice | Refusal:
    if case.retiming is None:
        return Refusal("There is no retiming yet.")
    snag, tracks, made = case.snag, case.made.tracks, case.made
    if snag.knot < 0 or snag.knot + 1 >= len(tracks.time_s):
        return Refusal("No single hit is to blame that could be pinned.")
    lands = float(tracks.time_s[snag.knot + 1])
    if np.any(np.abs(made.pins_s - lands) < 1e-6):
        return Refusal("It is pinned already.")
    if not any(abs(hit.was_s - lands) < 1e-6 for hit in case.retiming.hits_moved):
        return Refusal("The retiming does not move this hit, so there is nothing to pin.")
    edit = pin_here(case.text, made, lands)
    try:
        after = case.remake(apply(case.text, edit))
        again = retime_score(after, after=case.retiming)
    except (Faults, Unsolved):
        return Refusal("With this instant pinned no retiming is found.")
    if again.pins_short:
        short = max(one.short_s for one in again.pins_short)
        return Refusal(f"With this instant pinned what must happen before it lacks {short:.3f} s.")
    left = len(check(again.tracks, after.rig, after.abilities).snags)
    if left:
        return Refusal(f"With this instant pinned {left} snag{'' if left == 1 else 's'} would be left after retiming.")
    cost = f"{case.retiming.cost:.3g} to {again.cost:.3g} stroke-seconds"
    return Choice("pin", f"Pin this: {edit.say}; the retiming leads instead, {cost}", edit, after, again.tracks, left)


_WAYS: dict[str, Callable[[_Case], Choice | Refusal]] = {
    "time": _time, "lead": _lead, "shrink": _shrink, "air": _air, "retime": _retime, "pin": _pin,
}  # fmt: skip

_FOR: dict[str, tuple[str, ...]] = {
    "rate": ("time", "lead", "shrink", "retime", "pin"),
    "accel": ("time", "lead", "shrink", "retime", "pin"),
    "stroke": ("shrink",),
    "hold": ("shrink", "retime"),
    "switching": ("shrink", "retime"),
    "duty": ("shrink", "retime"),
    "air": ("air", "retime"),
}
"""The ways that may mend each kind of snag."""
