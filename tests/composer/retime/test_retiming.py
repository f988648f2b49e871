"""The laws of retiming, on small scores, and what it says of pins that are too close."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.retime.retiming import retime

from .scores import random_score, tracks_of

NONE = np.empty(0)
KEEPS = ("clock", "rhythm")
SOME = settings(max_examples=20, deadline=None)
seeds = st.integers(0, 10_000)
keeps = st.sampled_from(KEEPS)


def do(rig, tracks, pins=(), keep="clock", **more):
    return retime(tracks, abilities_of(rig), rig, np.asarray(pins, dtype=float), keep, **more)


def test_a_linear_move_at_twice_the_fill_rate_takes_twice_as_long(make_rig):
    tracks = tracks_of([[(0.0, 0.3, "linear"), (0.25, None, "end")]])
    found = do(make_rig(1), tracks)
    assert found.tracks.time_s[1] == 0.5
    assert found.cost == found.bound == 0.25


def test_a_free_start_leads_before_the_ensemble_waits(make_rig):
    slow = [(0.0, None, "hold"), (2.0, 0.3, "linear"), (2.25, None, "end")]
    others = [(0.0, None, "hold"), (1.0, 0.3, "linear"), (2.25, None, "end")]
    found = do(make_rig(3), tracks_of([slow, others, others]))
    assert not found.hits_moved
    assert [(lead.fiber, lead.was_s, lead.now_s) for lead in found.leads] == [(0, 2.0, 1.75)]
    assert found.cost == pytest.approx(0.25 / 20.0)


def test_those_who_land_together_still_land_together(make_rig):
    slow = [(0.0, 0.3, "linear"), (0.25, None, "end")]
    ready = [(0.0, 0.1, "linear"), (0.25, None, "end")]
    found = do(make_rig(3), tracks_of([slow, ready, ready]))
    assert set(found.tracks.time_s[1::2]) == {0.5}
    assert found.hits_moved[0].fibers == (0, 1, 2)
    assert found.cost == pytest.approx(0.25 * (1.0 + 1.0 / 3.0 + 1.0 / 3.0))


def test_rhythm_carries_everything_after_a_slow_passage_along(make_rig):
    track = [(0.0, 0.3, "linear"), (0.25, None, "hold"), (1.0, 0.0, "linear"), (3.0, None, "end")]
    clock, rhythm = (do(make_rig(1), tracks_of([track], 4.0), keep=keep) for keep in KEEPS)
    assert clock.tracks.time_s.tolist() == [0.0, 0.5, 1.0, 3.0]
    assert rhythm.tracks.time_s.tolist() == [0.0, 0.5, 1.25, 3.25]
    assert (clock.tracks.duration_s, rhythm.tracks.duration_s) == (4.0, 4.25)


def test_a_sudden_move_starts_with_its_hit_and_costs_nothing_by_itself(make_rig):
    sudden = [(0.0, None, "hold"), (1.4, 0.3, "sudden"), (1.9, None, "end")]
    slow = [(0.0, 0.3, "linear"), (0.5, 0.0, "linear"), (1.5, 0.3, "linear"), (1.9, None, "end")]
    found = do(make_rig(2), tracks_of([sudden, slow]))
    assert found.tracks.time_s[1:3] == pytest.approx([1.5, 2.0])
    assert found.cost == pytest.approx(0.1 * 2.0)
    assert not found.leads


def test_a_sudden_move_without_a_hold_waits_for_those_it_lands_with(make_rig):
    sudden = [(0.0, 0.03, "linear"), (0.5, 0.3, "sudden"), (1.0, None, "end")]
    slow = [(0.0, 0.3, "linear"), (0.5, 0.0, "linear"), (1.0, None, "end")]
    rig = make_rig(2)
    found = do(rig, tracks_of([sudden, slow]))
    assert found.tracks.time_s[:4] == pytest.approx([0.0, 0.5, 1.05, 1.5])
    assert found.tracks.manner[:4].tolist() == [1, 0, 2, 0]
    assert check(found.tracks, rig, abilities_of(rig)).ok


def test_hits_keep_their_order(make_rig):
    slow = [(0.0, 0.3, "linear"), (0.25, None, "end")]
    next_ = [(0.0, 0.03, "linear"), (0.3, None, "end")]
    found = do(make_rig(2), tracks_of([slow, next_]))
    assert found.tracks.time_s.tolist() == [0.0, 0.5, 0.0, 0.5]


def test_a_pinned_hit_stays_and_what_comes_before_gives(make_rig):
    track = [(0.0, 0.3, "linear"), (0.8, 0.0, "linear"), (1.5, None, "end")]
    free, pinned = do(make_rig(1), tracks_of([track])), do(make_rig(1), tracks_of([track]), [1.5])
    assert free.tracks.time_s.tolist() == pytest.approx([0.0, 0.8, 1.8])
    assert pinned.tracks.time_s.tolist() == pytest.approx([0.0, 0.5, 1.5])
    assert pinned.tracks.time_s[2] == 1.5


def test_a_pin_without_a_hit_keeps_the_hits_on_their_sides(make_rig):
    track = [(0.0, 0.3, "linear"), (0.25, None, "end")]
    other = [(0.0, 0.03, "linear"), (1.0, None, "end")]
    found = do(make_rig(2), tracks_of([track, other]), [0.4])
    assert [(short.from_s, short.to_s) for short in found.pins_short] == [(0.0, 0.4)]
    assert found.pins_short[0].short_s == pytest.approx(0.1)


def test_a_pin_with_some_give_lets_its_hit_move_so_far_and_no_further(make_rig):
    track = tracks_of([[(0.0, 0.3, "linear"), (0.4, None, "end")]])
    assert do(make_rig(1), track, [0.4], give_s=np.array([0.1])).tracks.time_s[1] == pytest.approx(0.5)
    assert do(make_rig(1), track, [0.4], give_s=np.array([0.09])).pins_short[0].short_s == pytest.approx(0.01)


def test_pins_too_close_name_the_fibers_the_seconds_and_the_factor(make_rig):
    lead = [(0.0, 0.3, "linear"), (0.5, None, "end")]
    then = [(0.0, 0.03, "linear"), (0.5, 0.3, "linear"), (0.8, 0.0, "linear"), (1.5, None, "end")]
    found = do(make_rig(2), tracks_of([lead, then]), [0.5, 1.5])
    (short,) = found.pins_short
    assert (short.from_s, short.to_s, short.fibers) == (0.5, 1.5, (1,))
    assert short.short_s == pytest.approx(0.45 + 1.0 - 1.0)
    assert 0.0 < short.factor < 1.0
    assert np.isnan(found.cost) and found.tracks is not None


def test_a_move_that_needs_two_seconds_and_has_one_and_a_half_shrinks_to_three_quarters(make_rig):
    track = [(0.0, 0.3, "linear"), (1.0, 0.0, "linear"), (1.75, None, "hold"), (5.0, 0.3, "linear"), (6.0, None, "end")]
    rig = make_rig(1, exhaust=0.15)
    track[2] = (2.5, None, "hold")
    found = do(rig, tracks_of([track]), [1.0, 2.5], shrink=True)
    (move,) = found.shrunk
    assert move.factor == pytest.approx(0.75, abs=1e-6)
    assert found.tracks.curve[2, 0] == pytest.approx(0.075)
    assert found.tracks.curve[3, 0] == found.tracks.curve[2, 0]
    assert found.tracks.curve[3].sum() == pytest.approx(0.3)
    assert check(found.tracks, rig, abilities_of(rig)).ok


def test_chains_through_sudden_moves_shrink_them_too(make_rig):
    track = [(0.0, None, "hold"), (0.1, 0.3, "sudden"), (0.4, None, "end")]
    found = do(make_rig(1), tracks_of([track]), [0.4], shrink=True)
    assert [move.factor for move in found.shrunk] == [pytest.approx(0.8, abs=1e-6)]
    assert not found.pins_short


def test_too_long_above_half_stroke_is_let_down_in_time(make_rig):
    track = [(0.0, 0.3, "linear"), (1.0, None, "hold"), (4.0, 0.0, "linear"), (5.0, None, "end")]
    rig = make_rig(1, max_hold_s=2.0)
    found = do(rig, tracks_of([track]))
    assert check(found.tracks, rig, abilities_of(rig)).ok
    # Half of the first move, the hold, half of the second: without the hold 2.5 s are left, so the last hit comes earlier too.
    assert found.tracks.time_s.tolist() == pytest.approx([0.0, 1.0, 1.0, 4.0])
    assert found.cost == pytest.approx(1.0 + 3.0 / 20.0)


def test_a_coil_that_asks_too_much_is_given_rest(make_rig):
    track, at = [], 0.0
    for n in range(12):
        track += [(at, 0.3 if n % 2 == 0 else 0.0, "linear"), (at + 1.0, None, "hold")]
        at += 1.2
    rig = make_rig(1, duty=0.5, duty_burst_s=3.0)
    tracks = tracks_of([[*track, (at, None, "end")]])
    assert {snag.kind for snag in check(tracks, rig, abilities_of(rig)).snags} == {"duty"}
    found = do(rig, tracks)
    assert check(found.tracks, rig, abilities_of(rig)).snags == ()
    assert found.bound == pytest.approx(found.cost, rel=1e-7)


def test_firm_moves_stay_where_others_can_give(make_rig):
    one = [(0.0, 0.3, "linear"), (0.4, 0.0, "linear"), (1.4, None, "end")]
    tracks = tracks_of([one])
    plain = do(make_rig(1), tracks, firm=np.array([1.0, 4.0, 1.0]))
    firm = do(make_rig(1), tracks, firm=np.array([4.0, 1.0, 1.0]))
    assert (plain.cost, firm.cost) == (pytest.approx(0.1 + 0.4), pytest.approx(0.4 + 0.1))


def test_a_section_may_keep_rhythm_while_the_rest_keeps_the_clock(make_rig):
    track = [(0.0, 0.3, "linear"), (0.25, None, "hold"), (1.0, 0.0, "linear"), (2.5, None, "hold"), (4.0, 0.3, "linear")]
    tracks = tracks_of([[*track, (6.0, None, "end")]])
    found = do(make_rig(1), tracks, rhythm=np.array([False, False, True, True, False, False]))
    assert found.tracks.time_s.tolist() == [0.0, 0.5, 1.25, 2.75, 4.0, 6.0]


@SOME
@given(seeds, keeps)
def test_nothing_moves_where_there_was_no_snag(make_rig, seed, keep):
    rig = make_rig(4, fill=5.0, exhaust=5.0)
    made = random_score(seed, sudden=False)
    tracks = replace(made.tracks, time_s=made.tracks.time_s * 1.7)
    assert check(tracks, rig, abilities_of(rig)).ok
    found = do(rig, tracks, made.pins_s, keep)
    assert found.cost == 0.0
    assert np.array_equal(found.tracks.time_s, tracks.time_s)


@SOME
@given(seeds, keeps)
def test_retiming_a_retimed_score_changes_nothing(make_rig, seed, keep):
    rig = make_rig(4, accel=(None, 3.0)[seed % 2])
    made = random_score(seed)
    once = do(rig, made.tracks, made.pins_s, keep, shrink=True)
    again = do(rig, once.tracks, made.pins_s, keep)
    assert np.array_equal(again.tracks.time_s, once.tracks.time_s)


@SOME
@given(seeds, keeps, st.floats(1.0, 3.0))
def test_a_faster_rig_never_costs_more(make_rig, seed, keep, factor):
    made = random_score(seed, sudden=False)
    slow, fast = make_rig(4), make_rig(4, fill=0.6 * factor, exhaust=0.3 * factor)
    costs = [do(rig, made.tracks, made.pins_s, keep) for rig in (slow, fast)]
    assert costs[0].pins_short or costs[1].cost <= costs[0].cost + 1e-9


@SOME
@given(seeds, keeps, st.floats(0.1, 10.0))
def test_scaling_all_times_and_rates_by_one_factor_scales_the_cost(make_rig, seed, keep, factor):
    made = random_score(seed)
    scaled = replace(made.tracks, time_s=made.tracks.time_s * factor, duration_s=made.tracks.duration_s * factor)
    rig = make_rig(4, fill=0.6 / factor, exhaust=0.3 / factor, max_switch_Hz=50.0 / factor)
    plain = do(make_rig(4), made.tracks, made.pins_s, keep)
    found = do(rig, scaled, made.pins_s * factor, keep)
    assert bool(plain.pins_short) == bool(found.pins_short)
    if not plain.pins_short:
        assert found.cost == pytest.approx(plain.cost * factor, rel=1e-6, abs=1e-8)


@SOME
@given(seeds, keeps)
def test_growing_round_the_snags_costs_what_solving_the_whole_does(make_rig, seed, keep):
    made = random_score(seed, fibers=6, moves=12)
    grown, whole = (do(make_rig(6), made.tracks, made.pins_s, keep, whole=whole) for whole in (False, True))
    assert grown.cost == pytest.approx(whole.cost, abs=1e-8) or grown.pins_short


@pytest.mark.parametrize("keep", KEEPS)
def test_degenerate_scores_neither_hang_nor_lose_accuracy(make_rig, keep):
    rig = make_rig(3)
    at_once = tracks_of([[(0.0, 0.3, "linear"), (0.0, 0.1, "linear"), (0.0, None, "end")]] * 3)
    found = do(rig, at_once, keep=keep)
    assert found.tracks.time_s[:3] == pytest.approx([0.0, 0.5, 0.5 + 0.2 / 0.3])
    tiny = tracks_of([[(0.0, 1e-6, "linear"), (1e-7, 0.0, "linear"), (2e-7, None, "end")]])
    found = do(make_rig(1), tiny, keep=keep)
    assert np.diff(found.tracks.time_s) == pytest.approx([1e-6 / 0.6, 1e-6 / 0.3], rel=1e-6)
    assert do(rig, tracks_of([[(0.0, None, "end")]] * 3), keep=keep).cost == 0.0


def test_among_equal_costs_the_hits_that_come_first_stay(make_rig):
    # Landing earlier or taking off later: both hits weigh a stroke, and the first one has room before it.
    track = [(0.0, 0.3, "linear"), (1.0, 0.0, "linear"), (1.9, None, "end")]
    for whole in (False, True):
        assert do(make_rig(1), tracks_of([track]), whole=whole).tracks.time_s.tolist() == pytest.approx([0.0, 1.0, 2.0])


@SOME
@given(seeds, keeps)
def test_ties_are_broken_alike_however_the_work_is_divided(make_rig, seed, keep):
    rng = np.random.default_rng(seed)
    fibers = []
    for _ in range(4):
        at, track = 0.0, []
        for n in range(8):
            # Full strokes alone, on a coarse grid: nearly everything weighs the same.
            track += [(at, 0.3 if n % 2 == 0 else 0.0, "linear"), (at + 0.75, None, "hold")]
            at += 0.75 + 0.25 * int(rng.integers(1, 4))
        fibers.append([*track, (at, 0.0, "linear"), (at + 0.5, None, "end")])
    grown, whole = (do(make_rig(4), tracks_of(fibers), keep=keep, whole=whole) for whole in (False, True))
    assert grown.cost > 0.0
    assert grown.tracks.time_s == pytest.approx(whole.tracks.time_s, abs=1e-6)


def short_of_air(make_rig, count=4):
    return make_rig(count, air_mL=30.0, receiver_L=0.012, compressor_L_min=0.9)


def test_fills_that_overdraw_the_receiver_alone_are_spread_until_it_bears_them(make_rig):
    one = [(0.0, None, "hold"), (1.0, 0.3, "linear"), (1.5, None, "hold"), (8.0, 0.0, "linear"), (9.5, None, "end")]
    rig = short_of_air(make_rig)
    tracks = tracks_of([one] * 4)
    assert {snag.kind for snag in check(tracks, rig, abilities_of(rig)).snags} == {"air"}
    found = do(rig, tracks)
    assert check(found.tracks, rig, abilities_of(rig)).snags == ()
    # 120 mL out of a store of 42 mL, and 15 mL/s until the last of them is up: at the very least 5.2 s after the start.
    assert found.tracks.time_s[2] >= (120.0 - 42.0) / 15.0 - 1e-4
    assert found.bound <= found.cost + 1e-9


@settings(max_examples=5, deadline=None)
@given(seeds, keeps)
def test_where_air_is_short_no_snag_is_left_and_the_bound_is_never_above_the_cost(make_rig, seed, keep):
    rig = short_of_air(make_rig)
    made = random_score(seed, pins=False)
    found = do(rig, made.tracks, keep=keep)
    assert check(found.tracks, rig, abilities_of(rig)).snags == ()
    assert found.bound <= found.cost + 1e-9
    plenty = do(make_rig(4), made.tracks, keep=keep)
    assert found.bound >= plenty.cost - 1e-8


def crowded(hits: int, too_fast: int):
    """Ten fibers whose moves land one after another, so many in one second, some of them a thousand times as long."""
    fibers = []
    for f in range(10):
        begin, each = f / hits, 10.0 / hits
        track = [(0.0, None, "hold")] if f else []
        value = 0.0
        for n in range(hits // 10):
            size = 1e-3 if n % too_fast == too_fast - 1 else 1e-6
            value = value + size if n % 2 == 0 else max(value - size, 0.0)
            track.append((begin + n * each, value, "linear"))
        fibers.append([*track, (begin + (hits // 10) * each, None, "end")])
    return tracks_of(fibers)


def test_a_hundred_thousand_hits_within_a_second_are_retimed_exactly(make_rig):
    rig = make_rig(10)
    tracks = crowded(100_000, 501)
    abilities = abilities_of(rig)
    assert len(np.unique(tracks.time_s[1:])) > 90_000
    assert check(tracks, rig, abilities).snags
    found = do(rig, tracks)
    assert check(found.tracks, rig, abilities).ok
    assert found.bound == pytest.approx(found.cost, rel=1e-6)
    assert np.all(np.diff(found.tracks.time_s)[np.diff(tracks.time_s) > 0.0] >= 0.0)
