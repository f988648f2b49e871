"""What holds each moved hit, and what pins cost, on scores small enough to know."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.retime.proof import causes, pin_costs
from composer.retime.retiming import retime

from .scores import random_score, tracks_of

KEEPS = ("clock", "rhythm")


def do(rig, tracks, pins=(), keep="clock", **more):
    return retime(tracks, abilities_of(rig), rig, np.asarray(pins, dtype=float), keep, **more)


def test_a_hit_that_waits_for_a_slow_fiber_is_held_by_that_fibers_move(make_rig):
    slow = [(0.0, 0.3, "linear"), (0.25, None, "end")]
    ready = [(0.0, 0.1, "linear"), (0.25, None, "end")]
    (cause,) = causes(do(make_rig(2), tracks_of([ready, slow])).proof)
    assert (cause.kind, cause.fiber, cause.by, cause.after_s) == ("move", 1, "fill", 0.0)
    assert cause.needs_s == pytest.approx(0.5)
    assert cause.force == pytest.approx(1.0 + 1.0 / 3.0)


def test_a_hit_held_by_an_acceleration_says_so(make_rig):
    track = [(0.0, 0.3, "smooth"), (0.25, None, "end")]
    (cause,) = causes(do(make_rig(1, accel=0.5), tracks_of([track])).proof)
    assert (cause.kind, cause.by) == ("move", "accel")


def test_a_move_whose_rest_is_used_up_cannot_leave_before_the_landing_before_it(make_rig):
    track = [(0.0, 0.1, "linear"), (1.0, None, "hold"), (1.1, 0.3, "linear"), (1.2, None, "end")]
    (cause,) = causes(do(make_rig(1), tracks_of([track])).proof)
    assert (cause.kind, cause.after_s, cause.from_s, cause.to_s) == ("move", 1.0, 1.1, 1.2)


def test_a_hit_pushed_by_the_one_before_it_keeps_the_order(make_rig):
    slow = [(0.0, 0.3, "linear"), (0.25, None, "end")]
    next_ = [(0.0, 0.03, "linear"), (0.3, None, "end")]
    first, second = causes(do(make_rig(2), tracks_of([slow, next_])).proof)
    assert (first.kind, second.kind) == ("move", "order")
    assert (second.from_s, second.to_s) == (0.25, 0.3)


def test_a_hit_that_comes_earlier_is_held_by_the_move_on_to_a_pin(make_rig):
    track = [(0.0, 0.3, "linear"), (0.8, 0.0, "linear"), (1.5, None, "end")]
    found = do(make_rig(1), tracks_of([track]), [1.5])
    (cause,) = causes(found.proof)
    assert (cause.kind, cause.fiber, cause.by, cause.to_s, cause.pin) == ("move", 0, "exhaust", 1.5, 0)
    assert [cost.force for cost in pin_costs(found.proof)] == [0.0]


def test_hits_that_rhythm_carries_along_say_that_they_keep_their_distance(make_rig):
    track = [(0.0, 0.3, "linear"), (0.25, None, "hold"), (1.0, 0.0, "linear"), (3.0, None, "end")]
    first, second = causes(do(make_rig(1), tracks_of([track], 4.0), keep="rhythm").proof)
    assert (first.kind, second.kind) == ("move", "rhythm")
    assert (second.from_s, second.to_s) == (0.25, 3.0)


def test_a_hit_let_down_in_time_is_held_by_its_longest_hold(make_rig):
    track = [(0.0, 0.3, "linear"), (1.0, None, "hold"), (4.0, 0.0, "linear"), (5.0, None, "end")]
    (cause,) = causes(do(make_rig(1, max_hold_s=2.0), tracks_of([track])).proof)
    assert (cause.kind, cause.fiber) == ("hold", 0)


def test_a_hit_spread_for_the_coil_is_held_by_its_coil(make_rig):
    track, at = [], 0.0
    for n in range(12):
        # Each move is as fast as it can be, so only longer rests help.
        lasts = 0.5 if n % 2 == 0 else 1.0
        track += [(at, 0.3 if n % 2 == 0 else 0.0, "linear"), (at + lasts, None, "hold")]
        at += lasts + 0.02
    found = do(make_rig(1, duty=0.5, duty_burst_s=3.0), tracks_of([[*track, (at, None, "end")]]))
    assert "duty" in {cause.kind for cause in causes(found.proof)}


def test_a_hit_spread_for_the_air_is_held_by_the_air(make_rig):
    one = [(0.0, None, "hold"), (1.0, 0.3, "linear"), (1.5, None, "hold"), (8.0, 0.0, "linear"), (9.5, None, "end")]
    found = do(make_rig(4, air_mL=30.0, receiver_L=0.012, compressor_L_min=0.9), tracks_of([one] * 4))
    assert "air" in {cause.kind for cause in causes(found.proof)}


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 10_000), st.sampled_from(KEEPS))
def test_every_moved_hit_of_a_random_score_is_held_by_something(make_rig, seed, keep):
    made = random_score(seed)
    found = do(make_rig(4, max_hold_s=(0.0, 4.0)[seed % 2]), made.tracks, made.pins_s, keep)
    if found.proof is None:
        assert found.pins_short
        return
    held = causes(found.proof)
    assert len(held) == len(found.hits_moved)
    events, shift = found.proof.events, found.proof.shift_s
    moved = np.flatnonzero(shift[: events.hits])
    own = (shift - np.append(shift, 0.0)[found.proof.terms.behind])[moved]
    for cause, by in zip(held, own, strict=True):
        assert (cause.kind == "rhythm") == (abs(by) <= 1e-9)
        assert cause.kind == "rhythm" or cause.force > 0.0


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 10_000), st.sampled_from(KEEPS))
def test_what_a_pin_costs_is_what_a_little_give_spares(make_rig, seed, keep):
    made, rig, little = random_score(seed, moves=3), make_rig(4), 1e-4
    found = do(rig, made.tracks, made.pins_s, keep)
    if found.proof is None or not len(found.pins_s):
        return
    for number, cost in enumerate(pin_costs(found.proof)):
        give = np.zeros(len(found.pins_s))
        give[number] = little
        spared = found.cost - do(rig, made.tracks, found.pins_s, keep, give_s=give).cost
        assert spared <= abs(cost.force) * little + 1e-8


def test_a_pin_that_stands_against_a_slow_move_costs_what_its_hits_before_weigh(make_rig):
    # Without the pin the second landing would wait; with it the first one comes earlier, which weighs as much.
    track = [(0.0, 0.3, "linear"), (1.0, 0.0, "linear"), (1.5, None, "hold"), (3.0, 0.15, "linear"), (4.0, None, "end")]
    found = do(make_rig(1), tracks_of([track]), [1.5])
    (cost,) = pin_costs(found.proof)
    assert cost.force == pytest.approx(0.0, abs=1e-9)
    heavier = do(make_rig(1), tracks_of([track]), [1.5], firm=np.array([3.0, 1.0, 1.0, 1.0, 1.0]))
    (cost,) = pin_costs(heavier.proof)
    assert cost.force == pytest.approx(3.0 - 1.0)
