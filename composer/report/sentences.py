"""Every sentence about a snag, in one place: what is asked, what can be done, and what would mend it."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from composer.limits.air import store_L
from composer.limits.snag import Snag
from composer.quivers import Quivers
from composer.rig.model import Rig
from composer.tracks import HOLD, SAME_INSTANT_S, STEP, SUDDEN, Tracks

MOST_NAMES = 4
"""Fibers that a sentence names before it says how many more there are."""


@dataclass(frozen=True, slots=True, eq=False)
class Teller:
    """What sentences are made from: the score's tracks, the rig, and how a place is said ("2:1" for an instant in s)."""

    tracks: Tracks
    rig: Rig
    say_place: Callable[[float], str]


@dataclass(frozen=True, slots=True)
class Told:
    """A snag in words: what is wrong, and what would mend it."""

    says: str
    mends: str


def tell(snag: Snag, teller: Teller, fibers: Sequence[int] = ()) -> Told:
    """The sentences for a snag; `fibers` are those that it is told of together, where they are asked for the same."""
    return _KINDS[snag.kind](snag, teller, _Who.of(snag, teller, fibers))


def place_in_words(place: str) -> str:
    """A place as it is spoken: "2:1" is bar 2 count 1."""
    bar, _, count = place.partition(":")
    return f"bar {bar} count {count}"


@dataclass(frozen=True, slots=True)
class _Who:
    """The subject of a sentence, and its verbs in the right number."""

    names: str
    many: bool

    @staticmethod
    def of(snag: Snag, teller: Teller, fibers: Sequence[int]) -> "_Who":
        indices = list(fibers) or ([] if snag.fiber is None else [snag.fiber])
        return _Who(named([teller.rig.fibers[f].name for f in indices]), len(indices) > 1)

    def verb(self, one: str, many: str) -> str:
        """The names with the verb in their number."""
        return f"{self.names} {many if self.many else one}"

    def then(self, one: str, many: str) -> str:
        """As `verb` where the names have been said already."""
        return f"they {many}" if self.many else f"it {one}"


def named(names: Sequence[str]) -> str:
    """Fibers as a sentence names them: runs as ranges, as a score writes them, and not too many of either."""
    runs: list[list[str]] = []
    for name in names:
        stem, _, number = name.rpartition(".")
        last, _, previous = runs[-1][-1].rpartition(".") if runs else ("", "", "")
        if stem and stem == last and number.isdigit() and previous.isdigit() and int(number) == int(previous) + 1:
            runs[-1].append(name)
        else:
            runs.append([name])
    said: list[tuple[str, int]] = []
    for run in runs:
        said += [(f"{run[0]}-{run[-1].rpartition('.')[2]}", len(run))] if len(run) > 2 else [(name, 1) for name in run]
    if len(said) > MOST_NAMES:
        rest = sum(count for _, count in said[MOST_NAMES - 1 :])
        said = [*said[: MOST_NAMES - 1], (f"{rest} more", rest)]
    return listed([words for words, _ in said])


def listed(names: Sequence[str]) -> str:
    """Names as a sentence lists them: "a", "a and b", "a, b and c"."""
    return names[0] if len(names) == 1 else " and ".join([", ".join(names[:-1]), names[-1]]) if names else ""


def two(needs: float, has: float) -> tuple[str, str]:
    """Two numbers as people write them, with as many digits as it takes to tell them apart."""
    for digits in (2, 3, 4, 6, 9):
        said = tuple(_digits(x, digits) for x in (needs, has))
        if said[0] != said[1]:
            return said
    return f"{needs:.12g}", f"{has:.12g}"


def _digits(x: float, digits: int) -> str:
    """Hundredths where a number is about 1 or more, else `digits` figures; more `digits` give more of either."""
    if abs(x) >= 0.0995 or x == 0.0:
        return f"{x:.{digits}f}"
    return f"{x:.{digits}g}" if abs(x) >= 1e-4 else f"{x:.{digits - 1}e}"


def enough(x: float) -> str:
    """A number of which at least so much is needed, with as many digits as `two` begins with, rounded up to what will do."""
    if x <= 0.0:
        return "0"
    unit = 0.01 if x >= 0.0995 else 10.0 ** (np.floor(np.log10(x)) - 1.0)
    return _digits(float(np.ceil(x / unit * (1.0 - 1e-6)) * unit), 2)


def _at(teller: Teller, seconds: float) -> str:
    return place_in_words(teller.say_place(seconds))


def _way(teller: Teller, knot: int) -> str:
    """Which way a segment goes, as a verb."""
    curve = teller.tracks.curve[knot]
    there = curve[1:].sum()
    both_ways = np.ptp(np.sign(np.diff(np.polyval(curve[::-1], np.linspace(0.0, 1.0, 33))))) > 1.0
    return "move" if both_ways else "fill" if there > 0.0 else "empty"


def _lasts(teller: Teller, knot: int) -> float:
    tracks = teller.tracks
    after = tracks.first[np.searchsorted(tracks.first, knot, side="right")]
    return 0.0 if knot + 1 == after else float(tracks.time_s[knot + 1] - tracks.time_s[knot])


def _move(snag: Snag, teller: Teller, who: _Who, needs_s: float, manner: str, why: str = "") -> Told:
    lasts = _lasts(teller, snag.knot)
    lands = _at(teller, float(teller.tracks.time_s[snag.knot]) + lasts)
    has, needs = two(lasts, needs_s)
    says = (
        f"{who.verb('is', 'are')} asked to {manner} in {has} s, landing at {lands}; {who.then('needs', 'need')} {needs} s{why}"
    )
    return Told(f"{says}{_in_a_row(snag, teller)}.", f"Give it {enough(needs_s - lasts)} s more.")


def _in_a_row(snag: Snag, teller: Teller) -> str:
    """How many moves the stretch of a snag goes through, where it tells of the worst of them."""
    tracks = teller.tracks
    here, there = tracks.first[snag.fiber], tracks.first[snag.fiber + 1]
    start = tracks.time_s[here:there]
    begin = here + max(int(np.searchsorted(start, snag.from_s + SAME_INSTANT_S, side="right")) - 1, 0)
    end = here + int(np.searchsorted(start, snag.to_s - SAME_INSTANT_S, side="left"))
    count = np.count_nonzero(tracks.manner[begin:end] != HOLD)
    return f" (the worst of {count} moves in a row)" if count > 1 else ""


def _rate(snag: Snag, teller: Teller, who: _Who) -> Told:
    tracks, knot = teller.tracks, snag.knot
    lasts = _lasts(teller, knot)
    if tracks.manner[knot] == STEP or lasts <= 0.0:
        return _jump(snag, teller, who)
    if not snag.mends:
        return _shaken(snag, teller, who)
    if tracks.manner[knot] == SUDDEN:
        told = _move(snag, teller, who, lasts * snag.needs / snag.has, f"{_way(teller, knot)} suddenly")
        return Told(told.says, f"{told.mends} Let the line before it end earlier.")
    if len(_quivers(teller, knot)):
        return _moved_and_shaken(snag, teller, who)
    told = _move(snag, teller, who, lasts * snag.needs / snag.has, _way(teller, knot))
    return Told(told.says, told.mends + _shrunk(snag))


def _quivers(teller: Teller, knot: int) -> np.ndarray:
    """The numbers of the quivers over a segment, the fastest swing first."""
    quivers = teller.tracks.quivers
    over = np.flatnonzero((quivers.knot <= knot) & (quivers.until > knot))
    return over[np.argsort(-quivers.hertz[over] * quivers.amplitude[over], kind="stable")]


def _quiver_in_words(teller: Teller, which: np.ndarray) -> str:
    """ "quiver at 4 Hz by 1.5 % strain" and so for each that lies over another."""
    quivers = teller.tracks.quivers
    said = [f"at {quivers.hertz[n]:.3g} Hz by {100.0 * quivers.amplitude[n]:.3g} % strain" for n in which]
    return f"quiver {listed(said)}"


def _slower(quivers: Quivers, which: np.ndarray, share: float) -> str:
    """How much smaller or slower quivers must be, rounded down to what will do."""
    if share <= 0.0:
        return "Take the quiver out"
    if len(which) > 1:
        return f"Make the quivers {_down(share)} as wide, or {_down(share)} as fast"
    one = which[0]
    amplitude, hertz = 100.0 * quivers.amplitude[one] * share, quivers.hertz[one] * share
    return f"Make it by at most {_down(amplitude)} % strain, or slow it to at most {_down(hertz)} Hz"


def _down(x: float) -> str:
    """Three figures, rounded down."""
    if x <= 0.0:
        return "0"
    unit = 10.0 ** (np.floor(np.log10(x)) - 2.0)
    return f"{np.floor(x / unit * (1.0 + 1e-12)) * unit:.6g}"


def _shaken(snag: Snag, teller: Teller, who: _Who) -> Told:
    """A quiver that is too fast by itself."""
    which = _quivers(teller, snag.knot)
    needs, has = two(snag.needs, snag.has)
    says = (
        f"{who.verb('is', 'are')} asked to {_quiver_in_words(teller, which)} from {_at(teller, snag.from_s)}: a rate of "
        f"{needs} 1/s, where {who.then('can', 'can')} do {has} 1/s."
    )
    mend = _slower(teller.tracks.quivers, which, snag.has / snag.needs)
    return Told(says, f"{mend}; no amount of time mends it.")


def _moved_and_shaken(snag: Snag, teller: Teller, who: _Who) -> Told:
    """A move that is too fast for what its quiver leaves it."""
    told = _move(snag, teller, who, _lasts(teller, snag.knot) * snag.needs / snag.has, _way(teller, snag.knot))
    quiver = _quiver_in_words(teller, _quivers(teller, snag.knot))
    return Told(f"{told.says[:-1]} with the {quiver} on top.", f"{told.mends} Or quiver less, or more slowly.")


def _shrunk(snag: Snag) -> str:
    """How much of the way would do, where that is some of it at all."""
    share = np.floor(100.0 * snag.has / snag.needs) / 100.0
    return f" Or ask for {share:.2f} of the way." if share >= 0.05 else ""


def _jump(snag: Snag, teller: Teller, who: _Who) -> Told:
    tracks, knot = teller.tracks, snag.knot
    way = tracks.curve[knot, 1:].sum()
    says = (
        f"{who.verb('is', 'are')} asked to jump by {abs(way) * 100.0:.3g} % strain at {_at(teller, snag.from_s)}, "
        "in no time at all; no fiber can."
    )
    if tracks.manner[knot] != STEP:
        return Told(says, "Give the move a duration.")
    return Told(
        says,
        "Write 'sudden' in place of 'step'. Where it is a phrase's line at 0, leave that out, or bring the fiber there first.",
    )


def _accel(snag: Snag, teller: Teller, who: _Who) -> Told:
    if len(which := _quivers(teller, snag.knot)):
        return _accelerated(snag, teller, who, which)
    needs_s = _lasts(teller, snag.knot) * np.sqrt(snag.needs / snag.has)
    told = _move(snag, teller, who, needs_s, _way(teller, snag.knot), " to speed up and slow down")
    return Told(told.says, told.mends + _shrunk(snag))


def _accelerated(snag: Snag, teller: Teller, who: _Who, which: np.ndarray) -> Told:
    """Acceleration with quivers, which take twice (2 pi f) squared times their amplitude in fading."""
    needs, has = two(snag.needs, snag.has)
    says = (
        f"{who.verb('is', 'are')} asked to {_quiver_in_words(teller, which)} from {_at(teller, snag.from_s)}: an acceleration "
        f"of up to {needs} 1/s², where {who.then('bears', 'bear')} {has} 1/s²."
    )
    if snag.mends:
        return Told(says, "Give the move beneath more time, or quiver less.")
    share = snag.has / snag.needs
    return Told(
        says,
        f"Make the quiver {_down(share)} as wide, or {_down(np.sqrt(share))} as fast; no amount of time mends it.",
    )


def _stroke(snag: Snag, teller: Teller, who: _Who) -> Told:
    at = _at(teller, snag.from_s)
    if snag.needs < 0.0:
        says = (
            f"{who.verb('is', 'are')} asked for up to {-snag.needs * 100.0:.3g} % strain below rest from {at} on; "
            "nothing goes there."
        )
        if len(_quivers(teller, snag.knot)):
            return Told(says, "Quiver less there, or further above rest; time does not mend it.")
        return Told(says, "Let the entries that add up ask for less there; time does not mend it.")
    needs, has = two(snag.needs * 100.0, snag.has * 100.0)
    says = f"{who.verb('is', 'are')} asked for up to {needs} % strain from {at} on; {who.then('can', 'can')} use {has} %."
    if len(_quivers(teller, snag.knot)):
        return Told(says, "Quiver less there, or round a smaller strain; time does not mend it.")
    return Told(says, f"Scale it to {np.floor(1000.0 * snag.has / snag.needs) / 1000.0:.3f} of that; time does not mend it.")


def _switching(snag: Snag, teller: Teller, who: _Who) -> Told:
    if not snag.mends and len(_quivers(teller, snag.knot)):
        needs, has = two(snag.needs, snag.has)
        says = (
            f"{who.verb('has its valve', 'have their valves')} change over {needs} times a second to "
            f"{_quiver_in_words(teller, _quivers(teller, snag.knot))} from {_at(teller, snag.from_s)}; it can {has} times."
        )
        return Told(says, f"Slow the quiver to at most {_down(0.5 * snag.has)} Hz; no amount of time mends it.")
    soon, least = two(1.0 / snag.needs, 1.0 / snag.has)
    says = (
        f"{who.verb('has its valve', 'have their valves')} switched on again after {soon} s at {_at(teller, snag.from_s)}; "
        f"it takes {least} s from one start to the next."
    )
    apart = "" if snag.mends else ", with less that must happen at the same time; no other times of these moves mend it"
    return Told(says, f"Let the moves follow one another without a hold, or begin further apart{apart}.")


def _duty(snag: Snag, teller: Teller, who: _Who) -> Told:
    needs, has = two(snag.needs, snag.has)
    says = (
        f"{who.verb('has its coil', 'have their coils')} on for {needs} s from {_at(teller, snag.from_s)} "
        f"to {_at(teller, snag.to_s)}; {who.then('bears', 'bear')} {has} s over that span."
    )
    # What is cut from an end makes the span shorter too, and so what it bears.
    over = snag.needs - snag.has
    at_ends = over / (1.0 - teller.rig.fibers[snag.fiber].mounting.valve.duty)
    mend = f"Let it rest {enough(over)} s more inside that span, or begin {enough(at_ends)} s later, or end that much earlier"
    return Told(says, f"{mend}." if snag.mends else f"{mend}; no other times of these moves mend it.")


def _hold(snag: Snag, teller: Teller, who: _Who) -> Told:
    needs, has = two(snag.needs, snag.has)
    says = (
        f"{who.verb('stays', 'stay')} above half stroke for {needs} s from {_at(teller, snag.from_s)}; "
        f"{who.then('may', 'may')} for {has} s."
    )
    if not snag.mends:
        return Told(
            says,
            "Let it come below half stroke in between, or go less high: what must happen meanwhile takes longer than that even "
            "at its fastest, so no amount of time mends it.",
        )
    return Told(says, f"Bring it below half stroke by {_at(teller, snag.from_s + snag.has)}.")


def _air(snag: Snag, teller: Teller, who: _Who) -> Told:
    needs, has = two(snag.needs, snag.has)
    says = (
        f"The fibers draw {needs} L of free air from {_at(teller, snag.from_s)} to {_at(teller, snag.to_s)}; "
        f"receiver and compressor have {has} L for it."
    )
    rho = teller.rig.supply.compressor_L_min / 60.0
    over = snag.needs - snag.has
    if snag.knot >= 0:
        lands = _at(teller, float(teller.tracks.time_s[snag.knot + 1]))
        holds = _down(store_L(teller.rig.supply))
        return Told(
            says,
            f"Let what lands suddenly at {lands} take its time, or go less far: it draws more at once than the {holds} L of a "
            "full receiver, so no amount of time mends it.",
        )
    if not snag.mends:
        return Told(says, f"Ask for {enough(over)} L less within that span; no other times of these moves mend it.")
    spread = f"Spread it over {enough(over / rho)} s more, or ask" if rho > 0.0 else "Ask"
    return Told(says, f"{spread} for {enough(over)} L less.")


def _pin(snag: Snag, teller: Teller, who: _Who) -> Told:
    has, needs = two(snag.has, snag.needs)
    says = (
        f"What must happen from {_at(teller, snag.from_s)} to {_at(teller, snag.to_s)} takes {needs} s; the pins leave {has} s."
    )
    return Told(says, f"Move the pins apart by {enough(snag.needs - snag.has)} s, or shrink the moves between them.")


_KINDS: dict[str, Callable[[Snag, Teller, _Who], Told]] = {
    "stroke": _stroke,
    "rate": _rate,
    "accel": _accel,
    "switching": _switching,
    "duty": _duty,
    "hold": _hold,
    "air": _air,
    "pin": _pin,
}
