"""From paths to a score ready to be checked, retimed, seen or played: the one way in for every command."""

import os
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.faults import Fault, Faults, Where, fault
from composer.files import read_text
from composer.limits.abilities import Abilities, abilities_of
from composer.rig.model import Rig
from composer.rig.reading import read_rig
from composer.rig.schema import MOST_BYTES
from composer.rig.select import Selector
from composer.score.bounds import most
from composer.score.expand import expand
from composer.score.model import Pin, Score
from composer.score.names import check_names, groups_of
from composer.score.reading import parse_score
from composer.score.tempo import TempoMap, fault_at, tempo_map, with_text
from composer.tracks import SAME_INSTANT_S, Tracks

Array = NDArray[np.float64]

MOST_PINS = 100_000
"""Pins of a score, repeats counted."""


@dataclass(frozen=True, slots=True)
class CuePoint:
    """A cue at its instant, in seconds from the score's start."""

    name: str
    seconds: float
    wait: bool


@dataclass(frozen=True, slots=True, eq=False)
class Loaded:
    """A score with all that follows from it and its rig.

    pins_s, pins_give_s: (P,) instants that must not move, rising, and how far each may after all, in s, 0 where it may not
    cues: in order of time
    """

    score: Score
    rig: Rig
    abilities: Abilities
    tempo: TempoMap
    tracks: Tracks
    pins_s: Array
    pins_give_s: Array
    cues: tuple[CuePoint, ...]


def load_rig(path: str | os.PathLike[str]) -> Rig:
    """The rig of a file. Raises Faults with all that is wrong with it."""
    name = os.fspath(path)
    if name.lower().endswith(".score"):
        raise fault(name, "this is a score", "a rig file, such as NAME.rig.toml, which the score names in its line `rig`")
    return read_rig(read_text(name, MOST_BYTES), name)


def load_score(path: str | os.PathLike[str], rig: Rig | None = None) -> Loaded:
    """A score, the files it uses and its rig, expanded; `rig` stands in for the one that the score names.

    Raises Faults: those of rig and score together, as far as either can be told without the other.
    """
    name = os.fspath(path)
    if name.lower().endswith(".rig.toml"):
        raise fault(name, "this is a rig file", "a score, such as NAME.score, which names this rig in its line `rig`")
    folder = os.path.dirname(name)
    score, faults = parse_score(
        read_text(name, most("file")), name, lambda used: read_text(os.path.join(folder, used), most("file"))
    )
    if rig is None:
        rig = _rig_of(score, folder, faults)
    if faults and rig is not None and _names_are_known(score, faults):
        # Expansion looks names up too, but does not come to that now.
        faults += check_names(score, rig, Selector(rig, groups_of(score)))
    if rig is None or faults:
        raise Faults(faults)
    return made_from(score, rig)


def made_from(score: Score, rig: Rig, abilities: Abilities | None = None) -> Loaded:
    """What follows from a score that was read and its rig, whose abilities may be known already. Raises Faults."""
    abilities, tempo = abilities_of(rig) if abilities is None else abilities, tempo_map(score)
    tracks = expand(score, rig, abilities, Selector(rig, groups_of(score)), tempo)
    pins, give = pins_of(score, tempo)
    return Loaded(score, rig, abilities, tempo, tracks, pins, give, cues_of(score, tempo))


def _rig_of(score: Score, folder: str, faults: list[Fault]) -> Rig | None:
    """The rig that a score names; None, and faults, where it cannot be had."""
    if score.rig is None:
        # Where the statement is there but could not be read, or the file is none, that has been said.
        if not any(fault.where.text.lstrip().startswith("rig") or not fault.where.line for fault in faults):
            faults.append(Fault(Where(score.file), "the score names no rig", "a statement such as 'rig estuary.rig.toml'"))
        return None
    try:
        return load_rig(os.path.join(folder, score.rig.text))
    except Faults as wrong:
        for fault in wrong.faults:
            if fault.where.line:
                faults.append(fault)
            else:
                found = f"{fault.where.file}: {fault.found}"
                faults += with_text([fault_at(score.rig.span, found, fault.expected, fault.hint)], score)
        return None


def _names_are_known(score: Score, faults: list[Fault]) -> bool:
    """Whether every group that the score has was read, so that a name not found is a wrong name."""
    unsure = ("group", "use")
    return not any(fault.where.file != score.file or fault.where.text.startswith(unsure) for fault in faults)


def cues_of(score: Score, tempo: TempoMap) -> tuple[CuePoint, ...]:
    """The cues of a score in order of time. Raises Faults."""
    try:
        cues = [CuePoint(cue.name, float(tempo.seconds(tempo.counts_of(cue.at))), cue.wait) for cue in score.cues]
    except Faults as wrong:
        raise Faults(with_text(wrong.faults, score)) from None
    return tuple(sorted(cues, key=lambda cue: cue.seconds))


def pins_of(score: Score, tempo: TempoMap) -> tuple[Array, Array]:
    """The pinned instants in s, rising, and the give of each in s; of two pins at one instant the firmer counts."""
    instants, gives = [np.empty(0)], [np.empty(0)]
    total = 0
    try:
        for pin in score.pins:
            counts = _pinned(pin, tempo)
            total += len(counts)
            if total > MOST_PINS:
                raise Faults([fault_at(pin.span, f"up to here the score has {total} pins", f"at most {MOST_PINS}")])
            instants.append(tempo.seconds(counts))
            by = np.zeros(len(counts))
            if pin.within is not None:
                by = tempo.seconds(tempo.shifted(counts, float(pin.within.value), pin.within.unit)) - instants[-1]
            gives.append(by)
    except Faults as wrong:
        raise Faults(with_text(wrong.faults, score)) from None
    at, give = np.concatenate(instants), np.concatenate(gives)
    order = np.lexsort((give, at))
    at, give = at[order], give[order]
    if not len(at):
        return at, give
    first = np.flatnonzero(np.append(True, np.diff(at) > SAME_INSTANT_S))
    return at[first], np.minimum.reduceat(give, first)


def _pinned(pin: Pin, tempo: TempoMap) -> Array:
    """The counts of a pin and its repeats, the last at or before `until`."""
    at = tempo.counts_of(pin.at)
    if pin.every is None or pin.until is None:
        return np.array([at])
    until = tempo.counts_of(pin.until)
    if until < at:
        raise Faults([fault_at(pin.until.span, "the pins end before they begin", "a place after the first pin")])

    def place(counts: float) -> float:
        if pin.every.unit == "s":
            return float(tempo.seconds(counts))
        return float(tempo.bars(counts)) if pin.every.unit == "bars" else counts

    # So many fit between the first and the end, each counted in the unit in which they repeat.
    fit = (place(until) - place(at)) / float(pin.every.value)
    if fit > MOST_PINS:
        raise Faults([fault_at(pin.span, f"this pin is repeated {fit:.0f} times", f"at most {MOST_PINS} pins in a score")])
    repeats = np.arange(int(np.floor(fit + 1e-9)) + 1)
    return tempo.shifted(np.full(len(repeats), at), repeats * float(pin.every.value), pin.every.unit)
