"""From a take to the text of a score: whole, or laid over one that there is; what the command and a live session call."""

import os
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault, Faults, Where, fault, nearest
from composer.files import read_text
from composer.limits.abilities import Abilities, abilities_of
from composer.limits.check import Check, check
from composer.load import Loaded, load_rig, load_score, made_from
from composer.motion import strain_at
from composer.rig.model import Rig
from composer.rig.select import Selector
from composer.score.bounds import most
from composer.score.model import Score
from composer.score.names import groups_of
from composer.score.reading import read_score
from composer.score.tempo import tempo_map
from composer.tracks import Tracks
from player.takes.file import load_take, rig_of
from player.takes.fitting import Each, one_by_one
from player.takes.form import Take
from player.takes.laying import Laying
from player.takes.places import UNIT
from player.takes.settling import Settled, settle
from player.takes.steps import tolerance_for_steps
from player.takes.writing import Written, place_text, score_text, within_bounds, write

Array = NDArray[np.float64]

BLOCK = 1 << 20
"""Values compared at once."""


@dataclass(frozen=True, slots=True, eq=False)
class Made:
    """A score made of a take.

    text: the score; loaded, checked: what it expands to and what the rig cannot do of it
    fibers: how many were played; phrases, knots: written, moves and holds; until_s: how far the take goes
    worst, worst_fiber: share of stroke by which the score is off what was played at worst, and whose
    late: names of fibers that were not where the score has them as the take begins
    fell: lines of the score beneath that the take has taken over from; left_bytes: of the take, no whole record
    stepped: where it was played in steps, the tolerance, a share of stroke, that would write them as a curve
    """

    text: str
    loaded: Loaded
    checked: Check
    fibers: int
    phrases: int
    knots: int
    until_s: float
    worst: float
    worst_fiber: str
    late: tuple[str, ...]
    fell: tuple[int, ...]
    stepped: float | None
    complete: bool
    left_bytes: int


def make_score(
    path: str, out: str, *, rig: str | None = None, tolerance: float = 0.01, onto: str | None = None, at: str | None = None,
    tempo: float | None = None, meter: str | None = None, title: str | None = None, each: Each = one_by_one,
    tell: Callable[[float], None] = lambda share: None,
) -> Made:  # fmt: skip
    """The score of the take in a file, as it will stand at `out`; nothing is written yet.

    rig: instead of the one that the take names; tolerance: share of usable stroke; onto, at: the score that it is laid over,
    and the cue or place from which on; tempo, meter: of a score of its own, where the take was not played to a score
    each: what spreads the work over cores; tell: is told which share of it is done, more or less
    """
    take = load_take(path)
    folder = os.path.dirname(os.path.abspath(path))
    beneath = onto or (os.path.join(folder, take.score) if take.score else None)
    loaded: Loaded | None = None
    if onto or (beneath is not None and os.path.exists(beneath)):
        loaded = load_score(beneath, None if rig is None else load_rig(rig))
    played_on = rig_of(take, path, loaded.rig if loaded else load_rig(rig or os.path.join(folder, take.rig)))
    about = [
        f"Played by hand, {os.path.basename(path)}: curves within {tolerance * 100:g} % of the stroke of what was played.",
    ]
    if onto:
        return _laid(take, out, loaded, tolerance, at, about, os.path.basename(path), each, tell)
    statements = _statements(loaded.score if loaded else None, tempo, meter)
    folder_out = os.path.dirname(os.path.abspath(out))
    rig_path = os.path.relpath(played_on.file, folder_out).replace(os.sep, "/")
    title = title or os.path.splitext(os.path.basename(path))[0].replace('"', "'")
    bare = read_score("\n".join([f'rig "{rig_path}"', *statements]) + "\n", out)
    abilities, map_ = abilities_of(played_on), tempo_map(bare)
    settled = settle(
        take.time_s, lambda f: take.strain(take.governed, f), played_on, abilities, map_, tolerance, each=each, tell=tell
    )  # fmt: skip
    written = write(
        settled.voices, settled.paths, played_on, Selector(played_on, {}), map_, "take", punch=False,
    )  # fmt: skip
    text = within_bounds(score_text(written, title, rig_path, statements, about), out)
    return _made(take, text, out, played_on, settled, written, take.time_s, ())


def _laid(
    take: Take, out: str, loaded: Loaded, tolerance: float, at: str | None, about: list[str], name: str, each: Each,
    tell: Callable[[float], None],
) -> Made:  # fmt: skip
    score, rig, abilities, tempo = loaded.score, loaded.rig, loaded.abilities, loaded.tempo
    if os.path.realpath(os.path.dirname(os.path.abspath(out))) != os.path.realpath(
        os.path.dirname(os.path.abspath(score.file))
    ):
        raise fault(out, f"the paths in {score.file} start from its folder", "a file in that folder", "name one beside it")
    begin_s = float(take.time_s[0]) if at is None else _instant(at, loaded)
    # What was played before is dropped; where it comes in between two samples, it is where it was just then.
    times = np.concatenate([[begin_s], take.time_s[take.time_s > begin_s + 1e-9]])
    if len(times) < 2:
        raise fault(take.score or out, f"the take ends before {at or 'there'}", "a place that was played", "choose another")
    begin = round(float(tempo.counts(begin_s)) * UNIT)
    times[0] = float(tempo.seconds(begin / UNIT))

    def governed(fiber: int) -> Array:
        return np.interp(times, take.time_s, take.strain(take.governed, fiber))

    fibers = _played(loaded, governed, times, tolerance)
    selector = Selector(rig, groups_of(score))
    laying = Laying(score, rig, abilities, selector, tempo, fibers, begin)
    settled = settle(
        times, governed, rig, abilities, tempo, tolerance, laying.set_out(), fibers, every=True, each=each, tell=tell
    )  # fmt: skip
    called = _free("take", {section.name for section in score.sections})
    written = write(
        settled.voices, settled.paths, rig, selector, tempo, called, punch=True, taken=set(score.phrases)
    )  # fmt: skip
    end = max([begin, *(int(path.place[-1]) for path in settled.paths)])
    about.append(f"It begins at {place_text(begin, tempo)} and takes over from what stood there.")
    left = settled.tracks.curve[settled.tracks.first[1:] - 1, 0]
    laid = laying.lay(written, end, left, loaded.tracks.duration_s, called, about)
    return _made(take, within_bounds(laid.text, out), out, rig, settled, written, times, laid.fell)


def _played(loaded: Loaded, governed: Callable[[int], Array], times: Array, tolerance: float) -> NDArray[np.int64]:
    """The fibers that were played: those that went elsewhere than the score has them."""
    off = _furthest(loaded.tracks, loaded.abilities, governed, times)
    return np.flatnonzero(off > tolerance)


def _furthest(tracks: Tracks, abilities: Abilities, governed: Callable[[int], Array], times: Array) -> Array:
    """By how much each fiber of the tracks is off what it was let do, share of stroke, (F,)."""
    off = np.zeros(tracks.fibers)
    was = [governed(fiber).astype(np.float32) for fiber in range(tracks.fibers)]
    size = max(1, BLOCK // max(1, tracks.fibers))
    for begin in range(0, len(times), size):
        there = strain_at(tracks, abilities, times[begin : begin + size])
        for fiber in range(tracks.fibers):
            far = np.abs(there[fiber] - was[fiber][begin : begin + size]).max()
            off[fiber] = max(off[fiber], float(far / abilities.stroke[fiber]))
    return off


def _instant(at: str, loaded: Loaded) -> float:
    """The instant of a cue, or of a place as a score writes it. Raises Faults."""
    for cue in loaded.cues:
        if cue.name == at:
            return cue.seconds
    try:
        score = read_score(f'cue "here" at {at}\n', "--at")
        return float(loaded.tempo.seconds(loaded.tempo.counts_of(score.cues[0].at)))
    except Faults:
        hint = nearest(at, [cue.name for cue in loaded.cues])
        found = f"no cue '{at}' in {loaded.score.file}, and it is no place such as 9:1 or 12.5s"
        raise fault("--at", found, hint=hint) from None


def _free(name: str, taken: set[str]) -> str:
    number, free = 1, name
    while free in taken:
        number += 1
        free = f"{name}{number}"
    return free


def _statements(score: Score | None, tempo: float | None, meter: str | None) -> list[str]:
    """Meters and tempi: those of the score that was played to, else those asked for."""
    if score is not None and tempo is None and meter is None:
        spans = [statement.span for statement in (*score.meters, *score.tempi)]
        return [score.lines[span.file][span.line - 1][span.column - 1 : span.end - 1] for span in spans]
    return [f"meter   {meter or '4/4'}", f"tempo   {f'{tempo:.6f}'.rstrip('0').rstrip('.') if tempo else 60}"]


def _made(
    take: Take, text: str, out: str, rig: Rig, settled: Settled, written: Written, times: Array, fell: tuple[int, ...]
) -> Made:
    """The text read again, checked, and held against what was played."""
    folder = os.path.dirname(os.path.abspath(out))
    try:
        score = read_score(text, out, lambda used: read_text(os.path.join(folder, used), most("file")))
        loaded = made_from(score, rig)
    except Faults as wrong:
        raise Faults([*_own(out), *wrong.faults]) from None
    off = _furthest(
        loaded.tracks, loaded.abilities, lambda f: np.interp(times, take.time_s, take.strain(take.governed, f)), times
    )  # fmt: skip
    off[settled.late] = 0.0
    whose = int(off.argmax())
    return Made(
        text=text,
        loaded=loaded,
        checked=check(loaded.tracks, rig, loaded.abilities),
        fibers=sum(len(voice.fibers) for voice in settled.voices),
        phrases=written.count,
        knots=settled.knots,
        until_s=float(times[-1]),
        worst=float(off[whose]),
        worst_fiber=rig.fibers[whose].name,
        late=tuple(rig.fibers[int(f)].name for f in settled.late),
        fell=fell,
        stepped=tolerance_for_steps(settled.paths),
        complete=take.complete,
        left_bytes=take.left_bytes,
    )


def _own(out: str) -> list[Fault]:
    return [Fault(Where(out), "the score as it was made cannot be read", hint="this is a fault of drawcord; please report it")]
