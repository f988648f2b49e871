import numpy as np
import pytest

from composer.motion import rate_at, strain_at
from composer.tracks import HOLD, MOVE


def tracks(run):
    from player.governor import tracks_of

    return tracks_of(run.governor, np.array(run.time_s), run.strain, np.array([s.rate for s in run.states]))


def test_between_ticks_strain_runs_straight(run_of):
    run = run_of(2)
    run.wait(0.1, [0.3, 0.02])
    found = strain_at(tracks(run), run.abilities, np.array(run.time_s))
    assert found == pytest.approx(run.strain.T)
    halfway = strain_at(tracks(run), run.abilities, np.array([0.0025]))[:, 0]
    assert halfway == pytest.approx(0.5 * run.strain[1])


def test_ticks_of_standing_still_are_one_hold(run_of):
    run = run_of(1, max_switch_Hz=1000.0)
    run.wait(0.05, 0.0)
    run.wait(0.05, 0.3)
    run.wait(1.0, 0.03)
    made = tracks(run)
    assert list(made.manner).count(HOLD) == 2
    assert made.manner[0] == HOLD and made.manner[-1] == HOLD


def test_with_a_limit_of_acceleration_the_speed_has_no_jump_between_ticks(run_of):
    run = run_of(1, accel=20.0)
    run.wait(0.2, 0.3)
    run.wait(0.3, 0.05)
    made = tracks(run)
    inner = np.array(run.time_s[1:-1])
    before = rate_at(made, run.abilities, inner - 1e-9)[0]
    after = rate_at(made, run.abilities, inner)[0]
    assert after == pytest.approx(before, abs=1e-6)
    assert np.abs(after).max() == pytest.approx(0.6)


def test_a_tick_in_which_a_fiber_comes_to_a_stand_moves_to_its_end(run_of):
    run = run_of(1, accel=20.0)
    run.wait(0.5, 0.1003)
    made = tracks(run)
    standing = next(k for k, s in enumerate(run.states) if k > 5 and s.rate[0] == 0.0 and s.strain[0] > 0.1)
    in_it = (made.time_s >= run.time_s[standing - 1] - 1e-12) & (made.time_s < run.time_s[standing] - 1e-9)
    assert np.all(made.manner[in_it] == MOVE)
