"""From voices to text: phrases and the section that plays them, as a person would write them."""

from collections.abc import Collection
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

import numpy as np

from composer.faults import fault
from composer.rig.model import Rig
from composer.rig.select import Selector, UnknownName
from composer.score.bounds import BOUNDS, most
from composer.score.tempo import TempoMap
from composer.shapes import NAMES, QUIET
from player.takes.fewest import Path
from player.takes.places import UNIT
from player.takes.played import Index
from player.takes.voices import Voice

PAUSE_BARS = 1
"""A hold of so many bars ends a phrase: what comes after is another."""


@dataclass(frozen=True, slots=True)
class Gesture:
    """What a voice plays between two pauses: it begins at `place` (UNITs), its lines (offset and the rest), its last offset."""

    voice: int
    place: int
    lines: tuple[tuple[str, str], ...]
    ends: int


@dataclass(frozen=True, slots=True)
class Written:
    """The text of phrases and of the entries that play them; phrases and lines: how many."""

    phrases: str
    entries: str
    count: int
    lines: int


def write(
    voices: list[Voice], paths: list[Path], rig: Rig, selector: Selector, tempo: TempoMap, name: str, *, punch: bool,
    taken: Collection[str] = (),
) -> Written:  # fmt: skip
    """The phrases and entries of a take.

    name: what phrases are called after; punch: the take comes in at its first place exactly, and takes over there; otherwise
    phrases begin on whole counts; taken: names of phrases that there are already
    """
    gestures = [gesture for number, path in enumerate(paths) for gesture in gestures_of(path, number, tempo, punch=punch)]
    gestures.sort(key=lambda gesture: (gesture.place, gesture.voice))
    until = max((int(path.place[-1]) for path in paths), default=0)
    carries = max(range(len(gestures)), key=lambda k: gestures[k].place, default=-1)
    called: dict[object, str] = {}
    used = set(taken)
    phrases: list[str] = []
    entries: list[tuple[str, str, str]] = []
    for k, gesture in enumerate(gestures):
        voice = voices[gesture.voice]
        length = f" {number_text(Fraction(until - gesture.place, UNIT))}" if k == carries and until > gesture.place else ""
        alike = (gesture.lines, length)
        if alike not in called:
            called[alike] = _fresh(f"{name}.{_stem(voice, rig)}", used)
            phrases.append(f"phrase {called[alike]}{length}\n" + _columns(gesture.lines))
        for scale in np.unique(voice.scales)[::-1]:
            fibers = fibers_text(voice.fibers[voice.scales == scale], rig, selector)
            scaled = "" if scale == 1.0 else f"  scale {number_text(Fraction(str(round(float(scale), 4))))}"
            entries.append((fibers, called[alike], f"at {place_text(gesture.place, tempo)}{scaled}"))
    wide = max((len(entry[0]) for entry in entries if len(entry[0]) <= 40), default=0)
    far = max((len(entry[1]) for entry in entries), default=0)
    rows = [f"  {fibers:<{wide}}  {phrase:<{far}}  {rest}" for fibers, phrase, rest in entries]
    return Written("\n".join(phrases), "".join(row + "\n" for row in rows), len(phrases), sum(len(g.lines) for g in gestures))


def gestures_of(path: Path, voice: int, tempo: TempoMap, *, punch: bool) -> list[Gesture]:
    """What a path plays, cut where it pauses."""
    still = np.abs(np.diff(path.share)) < 1e-9
    bars = np.diff(tempo.bars(path.place / UNIT))
    cuts = [k for k in range(path.moves) if still[k] and bars[k] >= PAUSE_BARS]
    bounds = [-1, *cuts, path.moves]
    found = []
    for left, right in pairwise(bounds):
        moves = range(left + 1, right)
        if not len(moves):
            continue
        first = path.place[left + 1] if not still[left + 1] else path.place[left + 2]
        begin = int(path.place[0]) if punch and left < 0 else int(first // UNIT * UNIT)
        begin = max(begin, int(path.place[0]))
        lines = tuple(_lines(path, moves, still, begin))
        if lines:
            found.append(Gesture(voice, begin, lines, int(path.place[right])))
    if punch and (not found or found[0].place != path.place[0]):
        # A fiber that is still at first is taken over at once all the same.
        found.insert(0, Gesture(voice, int(path.place[0]), (("1", "hold"),), int(path.place[0])))
    return found


def _lines(path: Path, moves: range, still: np.ndarray, begin: int) -> list[tuple[str, str]]:
    """The lines of the moves: a hold is told by the move after it, and after the last there is none to tell."""
    lines, waited = [], begin
    for k in moves:
        if still[k]:
            continue
        shape = NAMES[path.shape[k]]
        words = [target_text(float(path.share[k + 1]))]
        if shape != QUIET:
            words.append(shape)
        if path.place[k] > waited and shape != "sudden":
            words.append(f"over {number_text(Fraction(int(path.place[k + 1] - path.place[k]), UNIT))}")
        lines.append((number_text(Fraction(int(path.place[k + 1]) - begin, UNIT)), " ".join(words)))
        waited = path.place[k + 1]
    return lines


def _columns(lines: tuple[tuple[str, str], ...]) -> str:
    wide = max(len(offset) for offset, _ in lines)
    return "".join(f"  {offset:<{wide}}  {rest}\n" for offset, rest in lines)


def number_text(value: Fraction) -> str:
    """A number in its shortest form: whole, decimal, or with a fraction where that is shorter than three digits or more."""
    whole, part = divmod(value, 1)
    if not part:
        return str(whole)
    mixed = f"{whole}+{part}" if whole else str(part)
    digits = next((n for n in range(1, 13) if 10**n % part.denominator == 0), None)
    if digits is None:
        return mixed if part.denominator <= 64 else f"{float(value):.9f}".rstrip("0").rstrip(".")
    decimal = f"{whole}.{int(part * 10**digits):0{digits}d}"
    return mixed if digits > 2 and len(mixed) < len(decimal) else decimal


def target_text(share: float) -> str:
    """A target: a share of the stroke, or its word."""
    if abs(share) < 1e-9:
        return "rest"
    if abs(share - 1.0) < 1e-9:
        return "full"
    return f"{share:.9f}".rstrip("0").rstrip(".")


def place_text(place: int, tempo: TempoMap) -> str:
    """A place in UNITs as bar and count."""
    counts = Fraction(int(place), UNIT)
    k = max(int(np.searchsorted(tempo.meter_count, float(counts), side="right")) - 1, 0)
    bars, count = divmod(counts - Fraction(float(tempo.meter_count[k])), Fraction(float(tempo.bar_counts[k])))
    return f"{int(tempo.meter_bar[k]) + bars + 1}:{number_text(count + 1)}"


def fibers_text(fibers: Index, rig: Rig, selector: Selector) -> str:
    """Names that select these fibers and no others: a group, or ranges and names."""
    group = _group(fibers, rig)
    if group:
        return group
    names: list[str] = []
    stems = [_numbered(rig.fibers[f].name) for f in fibers]
    k = 0
    while k < len(fibers):
        last = k
        while last + 1 < len(fibers) and stems[last] and stems[last + 1] == (stems[last][0], stems[last][1] + 1):
            last += 1
        text = f"{rig.fibers[fibers[k]].name}-{stems[last][1]}" if last > k else rig.fibers[fibers[k]].name
        if last > k and not _selects(selector, text, fibers[k : last + 1]):
            last, text = k, rig.fibers[fibers[k]].name
        names.append(text)
        k = last + 1
    return ", ".join(names)


def _selects(selector: Selector, text: str, fibers: Index) -> bool:
    try:
        return tuple(selector.resolve(text)) == tuple(int(f) for f in fibers)
    except UnknownName:
        return False


def _numbered(name: str) -> tuple[str, int] | None:
    stem, _, number = name.rpartition(".")
    return (stem, int(number)) if stem and number.isdecimal() and str(int(number)) == number else None


def _group(fibers: Index, rig: Rig) -> str:
    mine = tuple(int(f) for f in fibers)
    return next((name for name, members in rig.groups.items() if tuple(sorted(members)) == mine and len(mine) > 1), "")


def _stem(voice: Voice, rig: Rig) -> str:
    """What a voice's phrases are called after its fibers."""
    return _group(voice.fibers, rig) or rig.fibers[int(voice.fibers[0])].name


def _fresh(stem: str, used: set[str]) -> str:
    number = 1
    name = f"{stem}.{number}"
    while name in used:
        number += 1
        name = f"{stem}.{number}"
    used.add(name)
    return name


def score_text(written: Written, title: str, rig_path: str, statements: list[str], about: list[str]) -> str:
    """A whole score of a take."""
    lines = [*(f"# {line}" for line in about), ""]
    lines.append(f'title   "{title}"')
    plain = not any(character.isspace() or character in '"#' for character in rig_path)
    lines += [f"rig     {rig_path}" if plain else f'rig     "{rig_path}"', *statements]
    text = "\n".join(lines) + "\n"
    if written.phrases:
        text += "\n" + written.phrases
    return text + "\nsection take at 1:1\n" + written.entries


def within_bounds(text: str, file: str) -> str:
    """The text, if a score may be so large. Raises Faults."""
    lines, size = text.count("\n"), len(text.encode())
    for has, bound in ((lines, "lines"), (size, "file")):
        if has > most(bound):
            raise fault(
                file,
                f"written out this take would have {has} {BOUNDS[bound].says}",
                f"at most {most(bound)}",
                "allow it a greater tolerance, or record it in parts",
            )
    return text
