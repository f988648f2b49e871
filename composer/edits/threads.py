"""From a thread of the cloth to the line that moves it, and from a line to the fibers that it moves, and when."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.edits.instances import Instances, instances_of
from composer.edits.made import Made
from composer.score.model import Score, Span
from composer.tracks import Tracks

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Threads:
    """Tracks and what they are made of, ready for asking by fiber and by line; built once a state, asked by bisection.

    by_entry, by_line: (M,) the instances' lines in order of their entry's line, and of their own; the line numbers of both
    entries, moves: where entries and lines of phrases stand, by line
    """

    score: Score
    tracks: Tracks
    instances: Instances
    by_entry: Index
    entry_lines: NDArray[np.int32]
    by_line: Index
    lines: NDArray[np.int32]
    entries: dict[int, Span]
    moves: dict[int, Span]


@dataclass(frozen=True, slots=True)
class Source:
    """What moves a fiber at an instant: the segment (index into the tracks), its times, and the lines that made it.

    line: of the section's entry; phrase_line: of the phrase's line, 0 where it stands in another file
    entry, move: their spans; `move` None where the line stands in another file
    """

    fiber: int
    segment: int
    from_s: float
    to_s: float
    line: int
    phrase_line: int
    entry: Span
    move: Span | None


@dataclass(frozen=True, slots=True, eq=False)
class Stretches:
    """Stretches of time of fibers, (n,) each, by fiber and time; those on end of one fiber are one."""

    fiber: Index
    from_s: Array
    to_s: Array


def threads_of(made: Made) -> Threads:
    """A state made ready for asking."""
    score, tracks = made.score, made.tracks
    instances, _ = instances_of(score, made.rig, made.abilities, made.tempo)
    entry = instances.entry_line[instances.instance]
    by_entry, by_line = np.argsort(entry, kind="stable"), np.argsort(instances.line, kind="stable")
    return Threads(
        score,
        tracks,
        instances,
        by_entry,
        entry[by_entry],
        by_line,
        instances.line[by_line],
        {entry.span.line: entry.span for section in score.sections for entry in section.entries},
        {
            line.span.line: line.span
            for phrase in score.phrases.values()
            for line in phrase.lines
            if line.span.file == score.file
        },
    )


def source_at(threads: Threads, fiber: int, seconds: float) -> Source | None:
    """What moves a fiber at an instant, or moved it last where it holds; None before anything has."""
    tracks = threads.tracks
    low, high = int(tracks.first[fiber]), int(tracks.first[fiber + 1])
    k = low + max(0, int(np.searchsorted(tracks.time_s[low:high], seconds, side="right")) - 1)
    line = int(tracks.line[k])
    if line not in threads.entries:
        return None
    made = int(tracks.phrase_line[k])
    to_s = float(tracks.time_s[k + 1]) if k + 1 < high else max(float(tracks.duration_s), float(tracks.time_s[k]))
    return Source(fiber, k, float(tracks.time_s[k]), to_s, line, made, threads.entries[line], threads.moves.get(made))


def moved_by(threads: Threads, line: int) -> Stretches:
    """The fibers that a line of the text moves, and when: an entry (all of its phrases from first move to last), a phrase's
    line, the head of a phrase (all who play it) or of a section (all its entries).."""
    score = threads.score
    for section in score.sections:
        if section.span.line == line:
            return _of_entries(threads, [entry.span.line for entry in section.entries])
    for phrase in score.phrases.values():
        if phrase.span.file == score.file and phrase.span.line == line:
            players = [e.span.line for s in score.sections for e in s.entries if e.phrase.text == phrase.name]
            return _of_entries(threads, players)
    if line in threads.entries:
        return _of_entries(threads, [line])
    return _of_line(threads, line)


def _of_line(threads: Threads, line: int) -> Stretches:
    """What one line of a phrase moves: its way; its stay where it holds."""
    low, high = np.searchsorted(threads.lines, [line, line + 1]) if line > 0 else (0, 0)
    rows, all_ = threads.by_line[low:high], threads.instances
    from_s = np.where(all_.goes[rows], all_.leaves_s[rows], all_.before_s[rows])
    to_s = np.where(all_.goes[rows], all_.stops_s[rows], np.minimum(all_.until_s[rows], all_.cut_s[all_.instance[rows]]))
    return _joined(all_.fiber[all_.instance[rows]], from_s, to_s)


def _of_entries(threads: Threads, lines: list[int]) -> Stretches:
    """What entries move, each instance from the beginning of its first move to the end of its last."""
    all_ = threads.instances
    ranges = [np.searchsorted(threads.entry_lines, [line, line + 1]) for line in lines]
    rows = np.concatenate([threads.by_entry[low:high] for low, high in ranges] or [np.empty(0, np.int64)])
    rows = np.sort(rows[all_.goes[rows]])
    which = all_.instance[rows]
    opens = np.flatnonzero(np.diff(which, prepend=-1))
    if not len(opens):
        return _joined(np.empty(0, np.int64), np.empty(0), np.empty(0))
    ends = np.maximum.reduceat(all_.stops_s[rows], opens)
    return _joined(all_.fiber[which[opens]], np.minimum.reduceat(all_.leaves_s[rows], opens), ends)


def _joined(fiber: Index, from_s: Array, to_s: Array) -> Stretches:
    """Stretches by fiber and time, those that touch or overlap made one."""
    order = np.lexsort((to_s, from_s, fiber))
    fiber, from_s, to_s = fiber[order], from_s[order], to_s[order]
    if not len(fiber):
        return Stretches(fiber, from_s, to_s)
    # Each fiber's times are moved beyond those of the one before, so that one running maximum serves all.
    wide = float(to_s.max()) + 1.0
    reached = np.maximum.accumulate(to_s + fiber * wide)
    new = np.append(True, (from_s[1:] + fiber[1:] * wide) > reached[:-1])
    opens = np.flatnonzero(new)
    return Stretches(fiber[opens], from_s[opens], np.maximum.reduceat(to_s, opens))
