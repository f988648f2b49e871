"""What must be true of a score as a whole and can be told without its rig: tempi, places, pins, cues, phrases, entries."""

from bisect import bisect_right
from collections.abc import Callable, Iterator, Sequence
from fractions import Fraction
from itertools import pairwise

from composer.faults import Fault, nearest
from composer.score.bounds import BOUNDS, most
from composer.score.model import Duration, Entry, Line, Meter, Phrase, Place, Score, Section, Span
from composer.score.row import where

MOST_HINTS = 50
"""Unknown phrases for which the nearest is sought."""

BAD_METER = "meter?"
"""Among the doubtful names: a meter could not be read, so that no place can be judged."""

DEFAULT_METER = 4
"""Counts in a bar where the score names no meter."""


class Bars:
    """The meters of a score, in order: counts in each bar, and places as counts from the start."""

    def __init__(self, meters: tuple[Meter, ...]):
        placed = sorted((m.at.bar if m.at else 1, m.counts) for m in meters)
        if not placed or placed[0][0] > 1:
            placed.insert(0, (1, DEFAULT_METER))
        self.bars = [bar for bar, _ in placed]
        self.counts = [counts for _, counts in placed]
        self.starts = [0]
        for (bar, counts), (after, _) in pairwise(placed):
            self.starts.append(self.starts[-1] + (after - bar) * counts)

    def in_bar(self, bar: int) -> int:
        """Counts in a bar."""
        return self.counts[bisect_right(self.bars, bar) - 1]

    def count_of(self, place: Place) -> Fraction | None:
        """A place in counts from the score's start; None where it is written in seconds."""
        if place.seconds is not None:
            return None
        at = bisect_right(self.bars, place.bar) - 1
        return self.starts[at] + (place.bar - self.bars[at]) * self.counts[at] + place.count - 1


def check_score(score: Score, doubtful: set[str], torn: set[str], loose: Sequence[Entry] = ()) -> list[Fault]:
    """All that is wrong with a score whose lines were read.

    Args:
        score: the score as read
        doubtful: names whose own statement could not be read, so that nobody else is blamed; "*" for all names
        torn: phrases of which some lines could not be read
        loose: entries of sections whose first line could not be read
    """
    checks = _Checks(score, doubtful, torn)
    for entry in loose:
        _entry(checks, None, entry)
    for check in CHECKS:
        check(checks)
    return checks.faults


class _Checks:
    def __init__(self, score: Score, doubtful: set[str], torn: set[str]):
        self.score = score
        self.doubtful = doubtful
        self.torn = torn
        self.hints: dict[str, str] = {}
        self.bars = Bars(score.meters)
        self.faults: list[Fault] = []

    def fault(self, span: Span, found: str, expected: str = "", hint: str = "") -> None:
        lines = self.score.lines.get(span.file, ())
        text = lines[span.line - 1] if 0 < span.line <= len(lines) else ""
        self.faults.append(Fault(where(span, text), found, expected, hint))

    def hint(self, name: str) -> str:
        """The nearest phrase, or all there are; for a few names only, since the search takes its time in a long score."""
        if name not in self.hints and len(self.hints) < MOST_HINTS:
            phrases = list(self.score.phrases)
            self.hints[name] = (nearest(name, phrases) if len(phrases) <= MOST_HINTS * 20 else "") or _known(phrases)
        return self.hints.get(name, "")

    def order(self, early: Place, late: Place) -> Fraction | None:
        """How long after the one place the other is, in counts or seconds; None where one is in bars, the other in seconds."""
        first, then = self.bars.count_of(early), self.bars.count_of(late)
        if first is not None and then is not None:
            return then - first
        if early.seconds is not None and late.seconds is not None:
            return late.seconds - early.seconds
        return None


def _twice(checks: _Checks, what: str, found: list[tuple[object, Span]], hint: str) -> None:
    """One fault for each of `found` that says again what an earlier one said."""
    first: dict[object, Span] = {}
    for key, span in found:
        if key in first:
            checks.fault(span, f"{what}: here and in line {first[key].line}", "", hint)
        first.setdefault(key, span)


def _meters(checks: _Checks) -> None:
    bars = [(m.at.bar if m.at else 1, m.span) for m in checks.score.meters]
    _twice(checks, "two meters for one bar", bars, "keep one, or move one with 'at'")


def _tempi(checks: _Checks) -> None:
    if BAD_METER in checks.doubtful:
        return
    placed = [(checks.bars.count_of(t.at) if t.at else Fraction(0), t) for t in checks.score.tempi]
    keys = [((at, t.at.seconds if at is None else None), t.span) for at, t in placed]
    _twice(checks, "two tempi from one place", keys, "keep one, or move one with 'at'")
    for ramp in (tempo for tempo in checks.score.tempi if tempo.until is not None):
        apart = checks.order(ramp.at, ramp.until)
        if apart is not None and apart <= 0:
            checks.fault(ramp.until.span, "the change of tempo ends before it begins", "a place after its start")
    busy: tuple[Fraction, int] | None = None  # until when the changes so far last, and the line that says so
    for at, tempo in sorted(((at, t) for at, t in placed if at is not None), key=lambda one: (one[0], one[1].span.line)):
        end = checks.bars.count_of(tempo.until) if tempo.until else None
        if busy and at < busy[0]:
            found = f"this tempo begins within the change of tempo of line {busy[1]}"
            checks.fault(tempo.span, found, "a place before it begins, or where it ends or later")
        if end is not None and (busy is None or end > busy[0]):
            busy = end, tempo.span.line


def _every_place(score: Score) -> Iterator[Place | None]:
    for meter in score.meters:
        yield meter.at
    for tempo in score.tempi:
        yield tempo.at
        yield tempo.until
    for pin in score.pins:
        yield pin.at
        yield pin.until
    for cue in score.cues:
        yield cue.at
    for section in score.sections:
        yield section.at
        for entry in section.entries:
            yield entry.at


def _places(checks: _Checks) -> None:
    if BAD_METER in checks.doubtful:
        return
    for place in _every_place(checks.score):
        if place is None or place.seconds is not None:
            continue
        counts = checks.bars.in_bar(place.bar)
        if place.count >= counts + 1:
            checks.fault(
                place.span,
                f"bar {place.bar} has {counts} count{'s' if counts > 1 else ''} and no count {_number(place.count)}",
                f"a count from 1 to less than {counts + 1}",
            )


def _pins(checks: _Checks) -> None:
    if BAD_METER in checks.doubtful:
        return
    for pin in checks.score.pins:
        apart = checks.order(pin.at, pin.until) if pin.until else None
        if apart is not None and apart < 0:
            checks.fault(pin.until.span, "the pins end before they begin", "a place after the first pin")
        elif pin.every is not None and (times := _times(pin.every, pin.at, pin.until, apart)) > most("repeats"):
            checks.fault(pin.every.span, f"that makes {int(times)} pins", f"at most {most('repeats')}")


def _times(every: Duration, first: Place, last: Place, apart: Fraction | None) -> Fraction:
    """How many pins there are; 0 where only the tempo can tell."""
    if every.unit == "bars":
        return (last.bar - first.bar) / every.value
    if apart is not None and every.unit == ("counts" if first.seconds is None else "s"):
        return apart / every.value
    return Fraction(0)


def _cues(checks: _Checks) -> None:
    _twice(checks, "a cue of this name is there already", [(c.name, c.span) for c in checks.score.cues], "rename one")


def _phrases(checks: _Checks) -> None:
    for phrase in checks.score.phrases.values():
        whole = phrase.name not in checks.torn
        if not phrase.lines and whole:
            checks.fault(phrase.span, f"phrase '{phrase.name}' has no lines", "an indented line such as '  2  full  smooth'")
        for before, line in zip((None, *phrase.lines), phrase.lines, strict=False):
            _line(checks, before, line)
        last = phrase.lines[-1].offset if phrase.lines else None
        if last and phrase.length and last.unit == phrase.length.unit and phrase.length.value < last.value:
            checks.fault(
                phrase.length.span,
                f"phrase '{phrase.name}' is shorter than its last line, at {_number(last.value)} in line {last.span.line}",
                "a length of at least that, or none",
            )


def _line(checks: _Checks, before: Line | None, line: Line) -> None:
    """One line of a phrase against the one before it."""
    offset, over = line.offset, line.over
    first = before is None
    if before is not None and before.offset.unit == offset.unit and offset.value <= before.offset.value:
        found = f"this line's offset is not after that of line {before.span.line}"
        checks.fault(offset.span, found, f"more than {_number(before.offset.value)}")
    if offset.value == 0 and first:
        for extra, word in ((over, "over"), (line.quiver, "quiver")):
            if extra is not None:
                checks.fault(extra.span, f"nothing comes before a line at 0, so it cannot have '{word}'")
        if line.shape == "curve":
            checks.fault(dict(line.spans)["shape"], "nothing comes before a line at 0, so it cannot have 'curve'")
        return
    if over is None or over.unit != offset.unit or (before is not None and before.offset.unit != offset.unit):
        return
    gap = offset.value - (before.offset.value if before is not None else 0)
    if gap > 0 and over.value > gap:
        there = "the phrase's start" if before is None else f"line {before.span.line}"
        checks.fault(over.span, f"this move would begin before {there}", f"at most {_number(gap)}")


def _entries(checks: _Checks) -> None:
    total = 0
    for section in checks.score.sections:
        for entry in section.entries:
            total += _entry(checks, section, entry)
    if total > most("moves"):
        spans = [section.span for section in checks.score.sections]
        checks.fault(spans[0], f"written out, this score has more than {most('moves')} moves", "",
                     "fewer repeats, or parts of it as scores of their own")  # fmt: skip


def _entry(checks: _Checks, section: Section | None, entry: Entry) -> int:
    """One entry against the phrase it plays; how many moves it makes for each fiber."""
    score = checks.score
    phrase = score.phrases.get(entry.phrase.text)
    if phrase is None:
        if not {"*", entry.phrase.text} & checks.doubtful:
            checks.fault(entry.phrase.span, f"no phrase '{entry.phrase.text}'", "", checks.hint(entry.phrase.text))
        return 0
    torn = phrase.name in checks.torn
    if entry.retrograde and not torn and phrase.lines and phrase.lines[0].offset.value != 0:
        checks.fault(
            dict(entry.spans)["retrograde"],
            f"phrase '{phrase.name}' has no line at 0, so backwards it has nothing to end on",
            "a phrase whose first line is at 0",
        )
    if entry.repeat and entry.repeat.times > 1 and entry.repeat.every is None and not torn and _lasts_nothing(phrase):
        found = f"phrase '{phrase.name}' lasts no time, so its repeats need 'every'"
        checks.fault(entry.repeat.span, found, "'every' and a duration, such as 'times 4 every 8'")
    repeats = (entry.repeat.times if entry.repeat else 1) * (section.repeat.times if section and section.repeat else 1)
    moves = repeats * max(1, len(phrase.lines))
    if moves > most("moves"):
        checks.fault(
            entry.span,
            f"written out, this entry has {moves} moves for each fiber",
            f"at most {most('moves')} {BOUNDS['moves'].says}",
        )
        return 0
    return moves


def _lasts_nothing(phrase: Phrase) -> bool:
    return phrase.length is None and bool(phrase.lines) and phrase.lines[-1].offset.value == 0


def _known(names: list[str]) -> str:
    if not names:
        return "this score has no phrases yet"
    return "there are " + ", ".join(names[:8]) + (", …" if len(names) > 8 else "")


def _circles(checks: _Checks) -> None:
    """Groups that hold themselves, by way of others or not, and groups too deep within one another."""
    groups = checks.score.groups
    depth: dict[str, int] = {}
    for name in groups:
        if name in depth:
            continue
        path = {name: 1}  # the groups that are open, in order; each with its depth so far
        stack = [iter(groups[name].members)]
        while stack:
            here = next(reversed(path))
            member = next(stack[-1], None)
            if member is None:
                stack.pop()
                depth[here] = path.pop(here)
                if path:
                    _deeper(path, depth[here])
            elif member.text in path:
                way = list(path)
                loop = [*way[way.index(member.text) :], member.text]
                checks.fault(member.span, f"a group cannot hold itself: {_chain(loop)}", "", "take it out")
            elif member.text in depth:
                _deeper(path, depth[member.text])
            elif member.text in groups:
                path[member.text] = 1
                stack.append(iter(groups[member.text].members))
    deepest = next((groups[name] for name in groups if depth[name] > most("nesting")), None)
    if deepest:
        found = f"'{deepest.name}' holds more than {most('nesting')} {BOUNDS['nesting'].says}"
        checks.fault(deepest.span, found, "", "name the fibers themselves")


def _deeper(path: dict[str, int], below: int) -> None:
    last = next(reversed(path))
    path[last] = max(path[last], below + 1)


def _chain(names: list[str]) -> str:
    return " -> ".join(names if len(names) <= 8 else [*names[:4], "…", *names[-3:]])


def _number(value: Fraction) -> str:
    """A number as a score would have it."""
    whole, rest = divmod(value, 1)
    if not rest:
        return str(whole)
    if (rest * 1000).denominator == 1:
        return f"{float(value):g}"
    return f"{whole}+{rest}" if whole else str(rest)


CHECKS: tuple[Callable[[_Checks], None], ...] = (
    _meters, _tempi, _places, _pins, _cues, _phrases, _entries, _circles,
)  # fmt: skip
"""Every check, a row each."""
