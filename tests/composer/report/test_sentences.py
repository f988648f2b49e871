"""Sentences that a movement director understands."""

from dataclasses import replace

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.limits.snag import Snag
from composer.quivers import Quivers
from composer.report.sentences import Teller, enough, listed, named, place_in_words, tell, two
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, STEP, SUDDEN, Tracks


def _say(seconds: float) -> str:
    """Places of a score in 4/4 at 60 counts a minute, as written in a score."""
    bar, count = divmod(seconds, 4.0)
    return f"{int(bar) + 1}:{count + 1.0:g}"


def _track(*moves: tuple[float, float, str], duration_s: float | None = None) -> Tracks:
    """One fiber's track of (seconds, target, shape), line 10 of the score first."""
    time, curve, manner, shape, at = [0.0], [], [], [], 0.0
    for seconds, target, name in moves:
        row = PROGRESS.get(name, np.zeros(6)) * (target - at)
        row[0] += at
        curve.append(row)
        manner.append({"hold": HOLD, "step": STEP, "sudden": SUDDEN}.get(name, MOVE))
        shape.append(NAMES.index(name) if name in NAMES else -1)
        time.append(time[-1] + seconds)
        at = target
    curve.append(np.array([at, 0, 0, 0, 0, 0]))
    count = len(time)
    return Tracks(
        first=np.array([0, count]),
        time_s=np.array(time),
        curve=np.array(curve),
        manner=np.array([*manner, HOLD], dtype=np.int8),
        shape=np.array([*shape, -1], dtype=np.int8),
        line=np.array([10 + n if manner[n] != HOLD else 0 for n in range(count - 1)] + [0], dtype=np.int32),
        phrase_line=np.zeros(count, dtype=np.int32),
        duration_s=time[-1] if duration_s is None else duration_s,
    )


def _told(rig, tracks, kind):
    snags = [s for s in check(tracks, rig, abilities_of(rig)).snags if s.kind == kind]
    return tell(snags[0], Teller(tracks, rig, _say))


def test_a_move_that_is_too_fast_is_told_by_its_time_and_the_time_it_needs(make_rig):
    told = _told(make_rig(1, fill=0.6), _track((4.0, 0.0, "hold"), (0.25, 0.3, "linear")), "rate")
    assert told.says == "r.1 is asked to fill in 0.25 s, landing at bar 2 count 1.25; it needs 0.50 s."
    assert told.mends == "Give it 0.25 s more. Or ask for 0.50 of the way."


def test_a_fiber_that_lets_go_too_fast_is_said_to_empty(make_rig):
    told = _told(make_rig(1, exhaust=0.3), _track((1.0, 0.3, "linear"), (0.5, 0.0, "linear")), "rate")
    assert told.says == "r.1 is asked to empty in 0.50 s, landing at bar 1 count 2.5; it needs 1.00 s."


def test_the_time_that_a_sentence_asks_for_is_enough(make_rig):
    rig = make_rig(1, fill=0.6)
    tracks = _track((0.3, 0.3, "smooth"))
    (snag,) = check(tracks, rig, abilities_of(rig)).snags
    needs = 0.3 * snag.needs / snag.has
    assert f"it needs {needs:.2f} s" in tell(snag, Teller(tracks, rig, _say)).says
    assert check(_track((needs, 0.3, "smooth")), rig, abilities_of(rig)).ok


def test_a_sudden_move_with_too_little_time_is_told_as_one(make_rig):
    told = _told(make_rig(1, fill=0.6), _track((0.25, 0.3, "sudden")), "rate")
    assert told.says == "r.1 is asked to fill suddenly in 0.25 s, landing at bar 1 count 1.25; it needs 0.50 s."


def test_a_step_is_told_to_become_sudden(make_rig):
    told = _told(make_rig(1), _track((1.0, 0.0, "hold"), (0.0, 0.15, "step"), (1.0, 0.15, "hold")), "rate")
    assert told.says == "r.1 is asked to jump by 15 % strain at bar 1 count 2, in no time at all; no fiber can."
    assert "'sudden'" in told.mends


def test_every_other_kind_has_its_sentence(make_rig):
    cases = {
        "stroke": (make_rig(1, stroke=0.3), _track((4.0, 0.4, "linear"))),
        "accel": (make_rig(1, accel=4.0), _track((0.5, 0.2, "smooth"))),
        "hold": (make_rig(1, max_hold_s=2.0), _track((1.0, 0.3, "linear"), (5.0, 0.3, "hold"))),
        "duty": (make_rig(1, duty=0.5, duty_burst_s=2.0), _track((6.0, 0.3, "linear"))),
        "switching": (
            make_rig(1, max_switch_Hz=10.0),
            _track((0.05, 0.01, "linear"), (0.03, 0.01, "hold"), (0.05, 0.02, "linear")),
        ),
        "air": (make_rig(1, air_mL=9000.0, receiver_L=1.0, compressor_L_min=60.0), _track((2.0, 0.3, "linear"))),
    }
    said = {kind: _told(rig, tracks, kind) for kind, (rig, tracks) in cases.items()}
    assert said["stroke"].says == "r.1 is asked for up to 40.00 % strain from bar 1 count 4 on; it can use 30.00 %."
    assert said["stroke"].mends == "Scale it to 0.750 of that; time does not mend it."
    assert (
        said["accel"].says
        == "r.1 is asked to fill in 0.50 s, landing at bar 1 count 1.5; it needs 0.54 s to speed up and slow down."
    )
    assert said["hold"].says.startswith("r.1 stays above half stroke for 5.50 s from bar 1 count 1.5")
    assert said["hold"].says.endswith("; it may for 2.00 s.")
    assert said["hold"].mends == "Bring it below half stroke by bar 1 count 3.5."
    assert (
        said["duty"].says
        == "r.1 has its coil on for 6.00 s from bar 1 count 1 to bar 2 count 3; it bears 5.00 s over that span."
    )
    assert said["switching"].says == (
        "r.1 has its valve switched on again after 0.08 s at bar 1 count 1; it takes 0.10 s from one start to the next."
    )
    assert said["air"].says == (
        "The fibers draw 9.00 L of free air from bar 1 count 1 to bar 1 count 3; receiver and compressor have 5.50 L for it."
    )
    assert said["air"].mends == "Spread it over 3.50 s more, or ask for 3.50 L less."
    assert said["duty"].mends == "Let it rest 1.00 s more inside that span, or begin 2.00 s later, or end that much earlier."


@pytest.mark.parametrize("moves", [
    ((3.0, 0.15, "linear"), (1.0, 0.15, "hold"), (2.0, 0.3, "linear")),
    ((2.0, 0.0, "hold"), (4.0, 0.3, "linear")),
    ((4.0, 0.3, "linear"),),
])  # fmt: skip
def test_a_coil_that_is_on_too_long_is_in_order_after_each_thing_that_its_mend_names(make_rig, moves):
    # On for 6 s where 5 s are borne: 1 s of rest inside, or 2 s less at an end, which shortens the span as well.
    rig = make_rig(1, duty=0.5, duty_burst_s=2.0)
    assert not any(snag.kind == "duty" for snag in check(_track(*moves), rig, abilities_of(rig)).snags)


@pytest.mark.parametrize("needed", [0.405, 0.4, 0.0021, 1.001, 3.5, 0.12345, 2e-6])
def test_what_is_said_to_be_enough_is_enough_and_little_more(needed):
    said = float(enough(needed))
    assert needed * (1.0 - 2e-6) <= said <= (needed + 0.0101 if needed >= 0.0995 else 1.11 * needed)


def test_below_rest_is_told_as_below_rest(make_rig):
    told = _told(make_rig(1), _track((1.0, -0.02, "linear")), "stroke")
    assert told.says == "r.1 is asked for up to 2 % strain below rest from bar 1 count 1 on; nothing goes there."


def test_pins_too_close_are_told_with_what_is_lacking(make_rig):
    snag = Snag("pin", None, 0.0, 4.0, 4.5, 4.0, "s", -1, 3)
    told = tell(snag, Teller(_track((1.0, 0.1, "linear")), make_rig(1), _say))
    assert told.says == "What must happen from bar 1 count 1 to bar 2 count 1 takes 4.50 s; the pins leave 4.00 s."


def test_fibers_asked_for_the_same_are_told_in_one_sentence(make_rig):
    tracks = _track((0.25, 0.3, "linear"))
    (snag,) = check(tracks, make_rig(1), abilities_of(make_rig(1))).snags
    told = tell(snag, Teller(tracks, make_rig(4), _say), [0, 1, 2, 3])
    assert told.says.startswith("r.1-4 are asked to fill in 0.25 s")
    assert told.says.endswith("they need 0.50 s.")


@pytest.mark.parametrize(
    ("names", "said"),
    [
        (["a.1"], "a.1"),
        (["a.1", "a.2"], "a.1 and a.2"),
        (["a.1", "a.2", "a.3", "b"], "a.1-3 and b"),
        (["a.1", "a.3", "a.5"], "a.1, a.3 and a.5"),
        (["a.1", "a.3", "a.5", "a.7", "a.8", "a.9"], "a.1, a.3, a.5 and a.7-9"),
        (["a.1", "a.3", "a.5", "a.7", "a.9", "b", "c"], "a.1, a.3, a.5 and 4 more"),
    ],
)
def test_names_in_a_row_are_written_as_a_score_writes_them(names, said):
    assert named(names) == said


def test_a_list_of_none_is_empty():
    assert listed([]) == ""


def test_places_are_spoken():
    assert place_in_words("5:2.5") == "bar 5 count 2.5"


@pytest.mark.parametrize(
    ("needs", "has", "said"),
    [(0.72, 0.31, ("0.72", "0.31")), (0.7204, 0.7199, ("0.7204", "0.7199")), (12.0, 10.0, ("12.00", "10.00"))],
)
def test_two_numbers_are_told_apart(needs, has, said):
    assert two(needs, has) == said


def _quivering(amplitude: float, hertz: float, *, lasts: float = 2.0, at: float = 0.15, target: float | None = None) -> Tracks:
    """A fiber that goes slowly to a strain and quivers there, or on a move to another."""
    tracks = _track((8.0, at, "smooth"), (lasts, at if target is None else target, "linear"), (20.0, 0.15, "linear"))
    return replace(tracks, quivers=Quivers(*(np.array([value]) for value in (1, 2, hertz, amplitude))))


def test_a_quiver_too_fast_is_told_how_small_or_how_slow_it_may_be_and_either_will_do(make_rig):
    rig = make_rig(1, fill=0.6, exhaust=0.3)
    told = _told(rig, _quivering(0.05, 3.0), "rate")
    assert told.says == (
        "r.1 is asked to quiver at 3 Hz by 5 % strain from bar 3 count 1: a rate of 0.94 1/s, where it can do 0.30 1/s."
    )
    assert told.mends == "Make it by at most 1.59 % strain, or slow it to at most 0.954 Hz; no amount of time mends it."
    for amplitude, hertz in ((0.0159, 3.0), (0.05, 0.954)):
        assert check(_quivering(amplitude, hertz), rig, abilities_of(rig)).ok


def test_a_move_too_fast_for_its_quiver_is_told_the_time_that_it_needs_with_it(make_rig):
    rig = make_rig(1, fill=0.6, exhaust=0.6)
    told = _told(rig, _quivering(0.01, 4.0, lasts=0.2, target=0.25), "rate")
    assert told.says == (
        "r.1 is asked to fill in 0.20 s, landing at bar 3 count 1.2; it needs 0.29 s "
        "with the quiver at 4 Hz by 1 % strain on top."
    )
    assert told.mends == "Give it 0.087 s more. Or quiver less, or more slowly."
    assert check(_quivering(0.01, 4.0, lasts=0.2 + 0.087, target=0.25), rig, abilities_of(rig)).ok


def test_a_quiver_that_dips_below_rest_is_told_as_one(make_rig):
    told = _told(make_rig(1), _quivering(0.02, 1.0, at=0.01), "stroke")
    assert "up to 1 % strain below rest" in told.says
    assert told.mends.startswith("Quiver less there, or further above rest")


def test_a_quiver_too_fast_for_a_valve_is_told_the_frequency_that_it_can(make_rig):
    told = _told(make_rig(1, max_switch_Hz=5.0), _quivering(0.001, 4.0), "switching")
    assert (
        "change over 8.00 times a second to quiver at 4 Hz by 0.1 % strain from bar 3 count 1; it can 5.00 times" in told.says
    )
    assert told.mends == "Slow the quiver to at most 2.5 Hz; no amount of time mends it."


def test_a_quiver_too_abrupt_is_told_how_small_or_how_slow_it_may_be(make_rig):
    rig = make_rig(1, accel=5.0)
    assert "an acceleration of up to 12.63 1/s²" in _told(rig, _quivering(0.01, 4.0), "accel").says
    assert _told(rig, _quivering(0.01, 4.0), "accel").mends.startswith("Make the quiver 0.395 as wide, or 0.629 as fast")
    for amplitude, hertz in ((0.00395, 4.0), (0.01, 4.0 * 0.629)):
        assert check(_quivering(amplitude, hertz), rig, abilities_of(rig)).ok


def test_what_draws_too_much_at_once_is_told_to_take_its_time_and_a_span_past_mending_is_told_to_ask_for_less(make_rig):
    rig, tracks = make_rig(1, air_mL=9000.0, receiver_L=1.0, compressor_L_min=60.0), _track((0.5, 0.3, "sudden"))
    told = _told(rig, tracks, "air")
    assert told.mends == (
        "Let what lands suddenly at bar 1 count 1.5 take its time, or go less far: it draws more at once than the 3.5 L of "
        "a full receiver, so no amount of time mends it."
    )
    smooth = make_rig(1, air_mL=9000.0, receiver_L=1.0, compressor_L_min=60.0), _track((2.0, 0.3, "linear"))
    snag = next(snag for snag in check(smooth[1], smooth[0], abilities_of(smooth[0])).snags if snag.kind == "air")
    teller = Teller(smooth[1], smooth[0], _say)
    assert tell(replace(snag, mends=False), teller).mends.startswith("Ask for 3.50 L less within that span; no other times")
