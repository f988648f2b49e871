import numpy as np
import pytest

from composer.limits.duration import RESOLUTION
from player.governor import govern
from player.governor.causes import ACCEL, AIR, DUTY, HOLD, NONE, RATE, STROKE, SWITCHING

LEAST = 0.3 * RESOLUTION


def test_what_a_fiber_can_do_passes_unchanged(run_of):
    run = run_of(2, max_hold_s=5.0, duty=0.6, duty_burst_s=3.0)
    wanted = 0.09 - 0.09 * np.cos(np.arange(0.0, 2.0, 0.005) * np.pi)
    for strain in wanted[1:]:
        run.tick(strain)
        assert run.state.strain == pytest.approx([strain, strain], abs=LEAST)
    assert not run.cut[1:].any()


@pytest.mark.parametrize("dt", [0.0005, 0.002, 0.005, 0.01])
def test_a_jump_is_followed_at_the_rate_of_its_direction_at_any_tick(run_of, dt):
    run = run_of()
    up, down = run.wait(0.2, 0.3, dt), run.wait(0.2, 0.0, dt)
    assert up.strain == pytest.approx([0.6 * 0.2])
    assert down.strain == pytest.approx([0.6 * 0.2 - 0.3 * 0.2])
    assert up.cut == down.cut == [RATE]
    assert up.by == pytest.approx([0.3 - 0.12])


def test_the_length_of_ticks_makes_no_difference_to_where_a_fiber_comes(run_of):
    run = run_of()
    for dt in (0.001, 0.01, 0.0034, 0.0006):
        run.tick(0.3, dt)
    assert run.state.strain == pytest.approx([0.6 * 0.015])


def test_a_tick_that_is_longer_than_the_governor_was_made_for_is_refused(run_of):
    run = run_of()
    for dt in (0.0, -0.005, 0.0101, np.nan):
        with pytest.raises(ValueError, match=r"a tick of .* at most 0\.01 s"):
            govern(run.governor, run.state, np.zeros(1), dt)


@pytest.mark.parametrize(("wanted", "comes_to"), [(0.5, 0.3), (np.inf, 0.3), (-1.0, 0.0), (-np.inf, 0.0)])
def test_what_lies_outside_the_stroke_is_cut_to_its_end(run_of, wanted, comes_to):
    run = run_of()
    run.wait(0.1, 0.05)
    state = run.wait(2.0, wanted)
    assert state.strain == [comes_to]
    assert state.cut == [STROKE]
    assert state.by == wanted - comes_to


def test_what_is_no_number_is_taken_for_rest(run_of):
    run = run_of()
    run.wait(0.1, 0.05)
    assert run.wait(0.5, np.nan).strain == [0.0]
    assert run.state.by == [0.0]


def test_a_braced_fiber_says_acceleration_while_it_gathers_speed_and_rate_when_it_has_it(run_of):
    run = run_of(accel=20.0)
    assert run.tick(0.3).cut == [ACCEL]
    assert run.wait(0.05, 0.3).cut == [RATE]
    assert run.wait(0.6, 0.3).cut == [NONE]


def test_less_than_a_step_of_the_drive_starts_no_coil(run_of):
    run = run_of()
    run.wait(0.5, 0.1)
    for share in (0.9, -0.9, 0.5):
        state = run.tick(0.1 + share * LEAST)
        assert not state.on
        assert state.strain == [0.1]
    assert run.tick(0.1 + 1.1 * LEAST).on


def test_a_coil_that_is_on_stays_on_for_as_long_as_its_valve_needs(run_of):
    run = run_of(max_switch_Hz=20.0)
    run.wait(0.01, 0.1)
    here = run.state.strain[0]
    states = [run.tick(here) for _ in range(12)]
    assert [bool(s.on[0]) for s in states] == [True] * 8 + [False] * 4
    assert max(abs(s.strain[0] - here) for s in states) <= LEAST * (1.0 + 1e-9)
    assert {int(s.cut[0]) for s in states[:7]} == {NONE, SWITCHING}
    assert states[-1].strain == [here]


def test_a_fiber_that_comes_to_rest_at_once_is_at_rest_when_its_coil_may_be_switched_off(run_of):
    run = run_of(max_switch_Hz=20.0)
    run.tick(0.3)
    states = [run.tick(0.0) for _ in range(12)]
    assert states[7].strain > 0.0
    assert states[7].strain < LEAST
    assert states[-1].strain == 0.0


def test_exhausting_never_waits(run_of):
    run = run_of(max_switch_Hz=5.0, duty=0.5, duty_burst_s=1.0, receiver_L=0.003, compressor_L_min=0.0)
    random = np.random.default_rng(1)
    for _ in range(200):
        run.wait(random.uniform(0.005, 0.05), random.uniform(0.0, 0.3))
        before = run.state.strain[0]
        after = run.tick(0.0).strain[0]
        assert after == pytest.approx(max(before - 0.3 * 0.005, 0.0), abs=LEAST)


def test_a_coil_stops_filling_with_as_much_duty_left_as_the_way_back_takes(run_of):
    run = run_of(duty=0.5, duty_burst_s=1.0, fill=0.1, exhaust=0.3)
    run.wait(4.0, 0.3)
    top = run.strain.max()
    on_up, on_back = top / 0.1, top / 0.3
    # It stops and starts again a little: the sum says only that not more than the burst was used, and most of it.
    assert 0.8 < 0.5 * (on_up + on_back) < 2.0
    assert DUTY in run.cut
    while run.state.strain[0] > 0.0:
        before = run.state.strain[0]
        run.tick(0.0)
        assert run.state.strain[0] == pytest.approx(max(before - 0.3 * 0.005, 0.0), abs=LEAST)
    assert run.check().ok


def test_a_coil_that_holding_energises_is_brought_to_rest_in_time_and_recovers_there(run_of):
    run = run_of(duty=0.5, duty_burst_s=1.0, energised_while_holding=True)
    run.wait(5.0, 0.1)
    at_rest = (run.strain[:, 0] == 0.0).mean()
    assert 0.3 < at_rest < 0.7
    assert np.count_nonzero(run.cut[run.strain == 0.0] == DUTY) > 100
    assert run.check().ok


def test_a_coil_that_has_stopped_starts_again_only_when_it_has_recovered_some(run_of):
    run = run_of(duty=0.5, duty_burst_s=1.0, fill=0.1)
    run.wait(6.0, 0.3)
    on = np.array([bool(s.on[0]) for s in run.states])
    starts = np.flatnonzero(on[1:] & ~on[:-1])
    assert len(starts) >= 3
    assert np.all(np.diff(starts)[1:] * 0.005 > 0.1)


def test_a_hold_is_let_down_in_time_and_stays_down_until_wanted_lower(run_of):
    run = run_of(max_hold_s=1.0)
    run.wait(2.0, 0.3)
    assert run.state.strain == pytest.approx([0.45 * 0.3])
    assert run.state.let_down and run.state.cut == [HOLD]
    above = run.strain[:, 0] > 0.15
    assert 0.9 < above.sum() * 0.005 <= 1.0
    assert run.wait(0.5, 0.2).strain == pytest.approx([0.45 * 0.3])
    run.wait(0.2, 0.1)
    assert run.wait(0.3, 0.2).strain == pytest.approx([0.2])
    assert run.check().ok


def test_a_hold_that_ends_in_time_by_itself_is_not_touched(run_of):
    run = run_of(max_hold_s=1.0)
    run.wait(0.55, 0.3)
    run.wait(1.0, 0.1)
    assert not (run.cut == HOLD).any()
    assert run.strain.max() == pytest.approx(0.3)


def test_filling_fibers_share_what_air_is_left_in_proportion_to_what_they_ask(run_of):
    run = run_of(3, receiver_L=0.001, compressor_L_min=0.06, fill=6.0)
    run.wait(0.005, [0.03, 0.006, 0.0])
    while run.tick([0.3, 0.3, 0.02]).air_share == 1.0:
        pass
    asked = np.minimum(6.0 * 0.005, np.array([0.3, 0.3, 0.02]) - run.states[-2].strain)
    got = run.state.strain - run.states[-2].strain
    assert got == pytest.approx(asked * run.state.air_share)
    assert np.all(got[:2] > 0.0)
    assert list(run.state.cut[:2]) == [AIR, AIR]


def test_an_empty_receiver_fills_fibers_as_fast_as_the_compressor_delivers(run_of):
    run = run_of(4, receiver_L=0.001, compressor_L_min=0.06, fill=6.0)
    run.wait(1.0, 0.3)
    assert run.strain[-1] - run.strain[101] == pytest.approx(np.full(4, 0.001 * 0.495 / 4 / 0.003 * 0.3), rel=0.01)
    assert run.check().ok


def test_no_asking_fiber_starves(run_of):
    run = run_of(30, receiver_L=0.001, compressor_L_min=0.6)
    wanted = np.linspace(0.02, 0.3, 30)
    run.wait(20.0, wanted)
    assert run.state.strain == pytest.approx(wanted)


def test_fibers_whose_source_is_silent_come_to_rest_at_two_thirds_of_their_rate(run_of):
    run = run_of(2)
    run.wait(0.5, 0.3)
    state = run.wait(0.3, 0.3, silent=np.array([True, False]))
    assert state.strain == pytest.approx([0.3 - 0.3 * 0.2, 0.3])
    assert run.wait(2.0, 0.3, silent=np.array([True, False])).strain == pytest.approx([0.0, 0.3])


def test_a_state_is_not_changed_by_the_tick_that_follows(run_of):
    run = run_of(3, accel=20.0, duty=0.5, max_hold_s=1.0)
    state = run.wait(0.2, 0.3)
    kept = [np.array(x) for x in (state.strain, state.rate, state.spent_s, state.above_s, state.here.back, state.cut)]
    run.wait(0.2, 0.0)
    for was, now in zip(
        kept, (state.strain, state.rate, state.spent_s, state.above_s, state.here.back, state.cut), strict=True
    ):
        assert np.array_equal(was, now)


def test_the_same_ticks_give_the_same_states(run_of):
    one, other = run_of(3, duty=0.5), run_of(3, duty=0.5)
    for run in (one, other):
        run.wait(1.0, [0.3, 0.1, 0.2])
    assert np.array_equal(one.strain, other.strain)


def test_a_rig_without_fibers_is_governed(run_of):
    run = run_of(0)
    assert run.tick(np.empty(0)).strain.shape == (0,)


def test_what_the_receiver_lacks_is_what_was_drawn_less_what_the_compressor_delivered(run_of):
    for delivered_L_min, left_L in ((0.0, 0.003), (0.12, 0.002), (40.0, 0.0)):
        run = run_of(compressor_L_min=delivered_L_min)
        run.wait(0.5, 0.3)
        assert run.wait(0.005, 0.3).air_missing_L == pytest.approx(left_L, abs=2e-5)


def test_standing_at_half_stroke_is_no_hold(run_of):
    run = run_of(max_hold_s=1.0)
    run.wait(3.0, 0.15)
    assert run.state.strain == [0.15]
    assert not (run.cut == HOLD).any()


def test_a_hold_that_ends_at_half_stroke_in_time_ends_there(run_of):
    run = run_of(max_hold_s=1.0)
    run.wait(0.5, 0.3)
    run.wait(1.5, 0.15)
    assert run.state.strain == [0.15]
    assert not run.state.let_down


def test_touching_half_stroke_does_not_begin_the_hold_anew(run_of):
    run = run_of(max_hold_s=1.0, fill=60.0, exhaust=60.0)
    for _ in range(300):
        run.tick(0.3)
        run.tick(0.15)
    assert HOLD in run.cut
    assert run.check().ok
