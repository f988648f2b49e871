"""Expansion held against a second one, written from the language alone: an object a move, closures, a fiber at a time."""

import math
from dataclasses import dataclass, field
from fractions import Fraction
from itertools import pairwise
from typing import Any

import numpy as np
from hypothesis import HealthCheck, given, settings

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from composer.motion import strain_at
from composer.rig.select import Selector
from composer.score.expand import expand
from composer.score.reading import read_score
from composer.tracks import MOVE, STEP, durations, end_strain

from .random_scores import scores

STROKE, FILL, EXHAUST, LENGTH_MM = 0.3, 0.6, 0.3, 400.0


def seconds_of(count: float) -> float:
    # Rounded, so that instants that are one are one number.
    return round(exact_seconds(count), 11)


def exact_seconds(count: float) -> float:
    """60 a minute for 8 counts, 90 for 4, then from 90 to 45 over 8 counts, 45 after that."""
    if count <= 8:
        return count
    if count <= 12:
        return 8 + (count - 8) / 1.5
    at_12, slope = 8 + 4 / 1.5, (0.75 - 1.5) / 8
    if count <= 20:
        return at_12 + math.log((1.5 + slope * (count - 12)) / 1.5) / slope
    return at_12 + math.log(0.5) / slope + (count - 20) / 0.75


def count_of(seconds: float) -> float:
    low, high = 0.0, 1000.0
    for _ in range(200):
        middle = (low + high) / 2
        low, high = (middle, high) if exact_seconds(middle) < seconds else (low, middle)
    return low


SHAPES = {
    "smooth": lambda u: u**3 * (10 - 15 * u + 6 * u * u),
    "linear": lambda u: u,
    "swell": lambda u: u * u,
    "settle": lambda u: 1 - (1 - u) ** 2,
}


def bezier(points: list[float], u: float) -> float:
    """De Casteljau's way, on purpose not the power basis."""
    while len(points) > 1:
        points = [p + (q - p) * u for p, q in pairwise(points)]
    return points[0]


@dataclass
class Piece:
    begin: float
    end: float
    value: Any  # of seconds


@dataclass
class Voice:
    """One instance: pieces are made as its time comes."""

    start: float
    steps: list
    cut: float = math.inf
    pieces: list[Piece] = field(default_factory=list)
    quivers: list[tuple] = field(default_factory=list)


def amount(target, scale: float) -> float:
    per = {"stroke": STROKE, "%": 0.01, "mm": 1 / LENGTH_MM}[target.unit]
    return float(target.value) * per * scale


def quiver_of(line, scale: float) -> tuple | None:
    """Hertz and amplitude of what a line quivers."""
    return line.quiver and (float(line.quiver.hertz), amount(line.quiver.by, scale))


def quivering(quivers: list[tuple], at: float) -> float:
    """The sum of quivers at an instant: a sine that opens and closes with the quarter of a sine."""
    value = 0.0
    for begin, end, hertz, amplitude in quivers:
        if begin < at < end:
            quarter = 0.25 / hertz
            opens, closes = (math.sin(math.pi / 2 * min(1.0, part / quarter)) for part in (at - begin, end - at))
            value += amplitude * opens * closes * math.sin(2.0 * math.pi * hertz * (at - begin))
    return value


def reached(pieces: list[Piece], at: float) -> float:
    value = 0.0
    for piece in pieces:
        if piece.begin <= at:
            value = piece.value(min(at, piece.end))
    return value


def later(start_count: float, by, stretch: float) -> float:
    if by.unit == "s":
        return round(seconds_of(start_count) + float(by.value) * stretch, 11)
    return seconds_of(start_count + float(by.value) * stretch)


def steps_of(phrase, start_count: float, entry) -> list:
    """(window's begin, its end, knot, target or None, shape, controls, quiver) of each line in seconds, either way."""
    stretch, scale = float(entry.stretch), float(entry.scale)
    lines = phrase.lines

    def seconds(count_parts: Fraction) -> float:
        return seconds_of(start_count + float(count_parts) * stretch)

    steps = []
    if not entry.retrograde:
        before = seconds_of(start_count)
        for line in lines:
            knot = later(start_count, line.offset, stretch)
            begin = before
            if line.over is not None:
                if line.over.unit == "s":
                    begin = knot - float(line.over.value) * stretch
                else:
                    begin = seconds_of(count_of(knot) - float(line.over.value) * stretch)
            target = None if line.target.unit == "hold" else amount(line.target, scale)
            controls = [None if c.unit == "hold" else amount(c, scale) for c in line.controls]
            steps.append((before, begin, knot, knot, target, line.shape, controls, quiver_of(line, scale)))
            before = knot
        return steps
    whole = (phrase.length or lines[-1].offset).value
    values = []
    for line in lines:
        values.append(values[-1] if line.target.unit == "hold" else amount(line.target, scale))
    start = seconds(Fraction(0))
    steps.append((start, start, start, start, values[-1], "linear", [], None))
    before = seconds(whole - lines[-1].offset.value)
    if before > start:
        steps.append((start, start, before, before, None, "linear", [], None))
    for k in range(len(lines) - 1, 0, -1):
        knot = seconds(whole - lines[k - 1].offset.value)
        end = knot
        if lines[k].shape == "step":
            end = before  # what jumped at its line backwards jumps there too
        elif lines[k].over is not None and lines[k].shape != "sudden":
            end = seconds_of(count_of(before) + float(lines[k].over.value) * stretch)
        shape = {"swell": "settle", "settle": "swell"}.get(lines[k].shape, lines[k].shape)
        controls = [values[k - 1] if c.unit == "hold" else amount(c, scale) for c in reversed(lines[k].controls)]
        steps.append((before, before, end, knot, values[k - 1], shape, controls, quiver_of(lines[k], scale)))
        before = knot
    return steps


def move_of(a: float, b: float, begin: float, end: float, shape: str, controls: list):
    """The value of a move as a function of seconds."""
    if end <= begin:
        return lambda t: b
    if shape == "curve":
        points = [a, *[a if c is None else c for c in controls], b]
        return lambda t: bezier(points, (t - begin) / (end - begin))
    progress = SHAPES.get(shape, SHAPES["linear"])
    return lambda t: a + (b - a) * progress((t - begin) / (end - begin))


def play(voice: Voice, value: float, cut: float) -> float:
    """Fill the voice's pieces, starting from `value`; returns the value at the cut or the end."""
    for before, begin, end, knot, target, shape, controls, quiver in voice.steps:
        if before >= cut and not (voice.start == before == knot):
            break
        a, b = value, value if target is None else target
        if shape == "step":
            begin = end
        elif shape == "sudden":
            begin = max(begin, end - abs(b - a) / (FILL if b > a else EXHAUST))
        strikes = shape == "sudden" and abs(b - a) > 1e-12
        if quiver and min(begin if strikes else knot, cut) > before + 1e-9:
            voice.quivers.append((before, min(begin if strikes else knot, cut), *quiver))
        voice.pieces.append(Piece(before, min(begin, cut), lambda t, a=a: a))
        if begin < cut or begin == end == cut:
            stop = min(end, cut)
            voice.pieces.append(Piece(begin, stop, move_of(a, b, begin, end, shape, controls)))
            value = voice.pieces[-1].value(stop)
    return value


def order_of(entry, count: int) -> list[float]:
    n = count
    if entry.canon is None:
        return [0.0] * n
    return {
        "start": list(range(n)),
        "end": [n - 1 - k for k in range(n)],
        "middle": [abs(2 * k - (n - 1)) // 2 for k in range(n)],
        "edges": [min(k, n - 1 - k) for k in range(n)],
    }[entry.canon.origin]


def naive(score, rig, selector):
    """For each fiber, its list of layers, each a list of pieces; for each its quivers; the end."""
    voices = {f: [] for f in range(len(rig.fibers))}
    layers = {f: [] for f in range(len(rig.fibers))}
    quivers = {f: [] for f in range(len(rig.fibers))}
    end = 0.0
    for section in score.sections:
        for entry in section.entries:
            phrase = score.phrases[entry.phrase.text]
            fibers = sorted({f for name in entry.fibers for f in selector.resolve(name.text)})
            ranks = order_of(entry, len(fibers))
            for outer in range(section.repeat.times if section.repeat else 1):
                first = 4.0 * (section.at.bar - 1) + float(section.at.count - 1)
                first += outer * float(section.repeat.every.value) if section.repeat else 0
                first += float(entry.after.value) if entry.after else 0
                for inner in range(entry.repeat.times if entry.repeat else 1):
                    whole = phrase.length or phrase.lines[-1].offset
                    each, unit = whole.value * entry.stretch, whole.unit
                    if entry.repeat and entry.repeat.every:
                        each, unit = entry.repeat.every.value, "counts"
                    gone = inner * float(each)
                    begun = count_of(seconds_of(first) + gone) if unit == "s" else first + gone
                    for rank, f in zip(ranks, fibers, strict=True):
                        c = begun + (rank * float(entry.canon.delay.value) if entry.canon else 0)
                        who = rig.fibers[f].mirror if entry.mirror else f
                        voice = Voice(seconds_of(c), steps_of(phrase, c, entry))
                        length = later(c, phrase.length or phrase.lines[-1].offset, float(entry.stretch))
                        (layers if entry.add else voices)[who].append((voice, length))
    for f, mine in voices.items():
        mine.sort(key=lambda pair: pair[0].start)
        pieces: list[Piece] = []
        for k, (voice, length) in enumerate(mine):
            cut = mine[k + 1][0].start if k + 1 < len(mine) else math.inf
            if abs(cut - voice.start) < 1e-9:
                return None, None, None
            play(voice, reached(pieces, voice.start), cut)
            pieces += voice.pieces
            quivers[f] += voice.quivers
            end = max(end, min(length, cut))
        stack = [pieces]
        for voice, length in layers[f]:
            play(voice, 0.0, math.inf)
            stack.append(voice.pieces)
            quivers[f] += voice.quivers
            end = max(end, length)
        layers[f] = stack
    return layers, quivers, end


@settings(max_examples=250, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores())
def test_expansion_gives_the_strain_that_a_naive_one_gives_everywhere(make_rig, text):
    rig = make_rig(4, stroke=STROKE, fill=FILL, exhaust=EXHAUST)
    abilities, selector = abilities_of(rig), Selector(rig, {})
    score = read_score(text, "law.score")
    expected, quivers, end = naive(score, rig, selector)
    try:
        tracks = expand(score, rig, abilities, selector)
    except Faults as wrong:
        assert expected is None and all("at one instant" in fault.found for fault in wrong.faults), wrong
        return
    assert expected is not None
    assert math.isclose(tracks.duration_s, end, abs_tol=1e-8)
    lasts = durations(tracks)
    for f, stack in expected.items():
        mine = slice(tracks.first[f], tracks.first[f + 1])
        knots = tracks.time_s[mine]
        edges = np.unique(np.concatenate([knots, [p.begin for layer in stack for p in layer], [end + 3.0]]))
        wide = np.flatnonzero(np.diff(edges) > 1e-7)
        shares = np.array([0.001, 0.13, 0.5, 0.77, 0.999])
        times = (edges[wide, None] + np.diff(edges)[wide, None] * shares).ravel()
        ours = strain_at(tracks, abilities, times)[f]
        theirs = [sum(reached(layer, t) for layer in stack) + quivering(quivers[f], t) for t in times]
        np.testing.assert_allclose(ours, theirs, atol=2e-9)

        # What the format of tracks promises.
        assert knots[0] == 0.0 and np.all(np.diff(knots) >= 0)
        manner, curve = tracks.manner[mine], tracks.curve[mine]
        assert manner[-1] == 0
        assert not np.any((manner[1:] == 0) & (manner[:-1] == 0))
        assert np.all(curve[manner == 0, 1:] == 0)
        assert np.all((lasts[mine][:-1] == 0) == (manner[:-1] == 3))
        np.testing.assert_allclose(curve[1:, 0], end_strain(tracks)[mine][:-1], atol=1e-12)
    for knot, until in zip(tracks.quivers.knot, tracks.quivers.until, strict=True):
        assert set(tracks.manner[knot:until].tolist()) <= {MOVE, STEP}
        assert tracks.time_s[until] > tracks.time_s[knot]
