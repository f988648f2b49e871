"""The score under the operator's hand, tick by tick."""

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.motion import strain_at
from player.engine.transport import Cue, Transport

DT = 0.005


@pytest.fixture
def transport(make_rig, make_tracks):
    """Two fibers that rise to 0.3 from 1 s to 3 s, hold, and are at rest again from 9 s to 13 s; 15 s long."""

    def make(cues=(), moves=((1.0, 3.0, 0.3), (9.0, 13.0, 0.0)), duration_s=15.0, shape="smooth", **rig):
        abilities = abilities_of(make_rig(2, **rig))
        return Transport(make_tracks(2, list(moves), shape, duration_s), abilities, tuple(cues))

    return make


def run(transport, seconds, until=None):
    """Strains (N, F) after each tick, and what happened, by tick."""
    strains, happened = [], {}
    for tick in range(round(seconds / DT)):
        told = transport.tick(DT)
        strains.append(transport.strain.copy())
        if told:
            happened[tick] = told
            if told == until:
                break
    return np.array(strains), happened


def fastest(strains, before=None):
    """The greatest rates (up, down) between ticks, in 1/s."""
    first = strains[:1] if before is None else before[None]
    rates = np.diff(np.concatenate([first, strains]), axis=0) / DT
    return rates.max(), -rates.min()


def test_a_score_played_through_is_what_its_tracks_say_at_every_tick(transport, make_rig, make_tracks):
    played = transport()
    played.start()
    strains, happened = run(played, 20.0, until="end")
    tracks = make_tracks(2, [(1.0, 3.0, 0.3), (9.0, 13.0, 0.0)], duration_s=15.0)
    wanted = strain_at(tracks, abilities_of(make_rig(2)), (np.arange(len(strains)) + 1) * DT)
    assert np.abs(strains - wanted.T).max() < 1e-9
    assert happened == {2999: "end"}


def test_a_pause_where_nothing_moves_stops_the_score_in_that_very_tick(transport):
    played = transport()
    played.start()
    run(played, 5.0)
    played.pause()
    at = played.position_s
    strains, _ = run(played, 2.0)
    assert played.position_s == at and played.phase == "standing"
    assert np.all(strains == 0.3)


def test_a_pause_in_mid_move_eases_to_a_stand_and_holds(transport):
    played = transport()
    played.start()
    run(played, 2.0)
    played.pause()
    strains, _ = run(played, 1.0)
    steps = np.diff(strains[:, 0])
    assert np.all(steps >= 0.0) and np.all(np.diff(steps[:48]) <= 1e-6)
    assert 2.0 < played.position_s < 2.0 + 0.25 and np.all(strains[60:] == strains[60])


def test_going_on_after_a_pause_plays_the_rest_as_written(transport):
    played = transport()
    played.start()
    run(played, 2.0)
    played.pause()
    run(played, 1.0)
    played.go_on()
    strains, happened = run(played, 20.0, until="end")
    assert list(happened.values()) == ["end"]
    up, down = fastest(strains)
    assert up <= 0.3 / 2.0 * 1.875 + 1e-6 and down <= 0.3 / 4.0 * 1.875 + 1e-6
    assert np.all(strains[-1] == 0.0)


def test_a_waiting_cue_stops_the_score_exactly_there_and_nothing_of_it_is_lost(transport):
    played = transport([Cue("doors", 5.0, wait=True)])
    played.start()
    _, happened = run(played, 30.0, until="wait")
    assert happened == {999: "wait"}
    assert played.position_s == 5.0 and played.waiting.name == "doors"
    run(played, 7.0)
    assert played.position_s == 5.0
    played.go_on()
    assert played.waiting is None
    _, happened = run(played, 30.0, until="end")
    assert list(happened) == [1999]


def test_a_cue_that_does_not_wait_is_passed(transport):
    played = transport([Cue("doors", 5.0)])
    played.start()
    run(played, 4.0)
    assert played.next_cue.name == "doors" and played.cue is None
    run(played, 2.0)
    assert played.next_cue is None and played.cue.name == "doors"


def test_where_something_moves_at_a_waiting_cue_the_score_eases_into_it(transport):
    played = transport([Cue("doors", 2.0, wait=True)])
    played.start()
    strains, happened = run(played, 30.0, until="wait")
    assert played.position_s == 2.0 and list(happened.values()) == ["wait"]
    steps = np.diff(strains[:, 0])
    assert steps[-1] < 0.2 * steps.max()


def test_two_waiting_cues_at_two_places_both_wait(transport):
    played = transport([Cue("a", 4.0, wait=True), Cue("b", 6.0, wait=True)])
    played.start()
    run(played, 30.0, until="wait")
    played.go_on()
    _, happened = run(played, 30.0, until="wait")
    assert played.waiting.name == "b" and list(happened) == [399]


def test_starting_from_a_place_brings_the_fibers_there_first_at_two_thirds_of_their_rate(transport):
    played = transport()
    played.start(5.0)
    assert played.phase == "bringing"
    strains = []
    while played.phase == "bringing":
        played.tick(DT)
        strains.append(played.strain.copy())
    up, _ = fastest(np.array(strains), np.zeros(2))
    assert 0.38 < up <= 0.4 + 1e-6
    assert played.position_s == 5.0 and np.all(played.strain == 0.3)
    _, happened = run(played, 20.0, until="end")
    assert list(happened) == [1999]


def test_starting_where_all_are_at_rest_starts_at_once(transport):
    played = transport()
    played.start(0.5)
    played.tick(DT)
    assert played.phase == "playing" and played.position_s == pytest.approx(0.5 + DT)


def test_starting_in_mid_move_eases_into_it(transport):
    played = transport()
    played.start(2.0)
    while played.phase == "bringing":
        played.tick(DT)
    strains, _ = run(played, 0.3)
    steps = np.diff(strains[:, 0])
    assert steps[0] < 0.1 * steps[-1] and np.all(np.diff(steps[:45]) > 0.0)


def test_a_waiting_cue_where_the_score_is_started_from_does_not_wait_again(transport):
    played = transport([Cue("doors", 5.0, wait=True)])
    played.start(5.0)
    _, happened = run(played, 40.0, until="end")
    assert list(happened.values()) == ["end"]


def test_a_jump_while_playing_brings_the_fibers_there_and_plays_on(transport):
    played = transport()
    played.start()
    run(played, 0.5)
    played.jump(8.5)
    strains, happened = run(played, 30.0, until="end")
    up, _ = fastest(strains)
    assert up <= 0.4 + 1e-6
    assert list(happened.values()) == ["end"] and len(strains) * DT == pytest.approx(6.5 + 1.40625, abs=0.02)


def test_a_jump_in_a_pause_brings_the_fibers_there_and_stands(transport):
    played = transport()
    played.start()
    run(played, 0.5)
    played.pause()
    run(played, 0.1)
    played.jump(5.0)
    strains, happened = run(played, 5.0)
    assert not happened and played.phase == "standing"
    assert played.position_s == 5.0 and np.all(strains[-1] == 0.3)


def test_a_jump_past_the_end_goes_to_the_end(transport):
    played = transport()
    played.start()
    run(played, 0.5)
    played.jump(1e6)
    _, happened = run(played, 5.0, until="end")
    assert list(happened.values()) == ["end"] and played.position_s == 15.0


@pytest.mark.parametrize("at_s", [0.0, 0.5, 1.2, 2.0, 2.9, 5.0, 9.5, 11.0, 14.0])
def test_a_stop_at_any_moment_ends_at_rest_at_the_safe_rate(transport, at_s):
    played = transport()
    played.start()
    before, _ = run(played, at_s)
    played.rest()
    strains, happened = run(played, 30.0, until="at_rest")
    assert list(happened.values()) == ["at_rest"] and played.phase == "at rest"
    assert np.all(strains[-1] == 0.0)
    _, down = fastest(strains, before[-1] if len(before) else None)
    assert down <= 0.2 + 1e-6


def test_a_stop_while_fibers_are_brought_to_a_place_lets_them_down_from_where_they_are(transport):
    played = transport()
    played.start(5.0)
    run(played, 0.5)
    half = played.strain.copy()
    assert np.all((half > 0.0) & (half < 0.3))
    played.rest()
    strains, happened = run(played, 30.0, until="at_rest")
    assert list(happened.values()) == ["at_rest"] and strains.max() <= half.max() and np.all(strains[-1] == 0.0)


def test_a_stop_in_a_pause_ends_at_rest(transport):
    played = transport()
    played.start()
    run(played, 5.0)
    played.pause()
    run(played, 1.0)
    played.rest()
    strains, happened = run(played, 30.0, until="at_rest")
    assert list(happened.values()) == ["at_rest"] and np.all(strains[-1] == 0.0)


def test_a_stop_at_a_score_that_has_not_begun_leaves_all_at_rest(transport):
    played = transport()
    played.rest()
    assert played.phase == "at rest"


def test_a_long_pause_lets_a_fiber_down_before_its_hold_is_over(transport):
    played = transport(max_hold_s=7.0)
    played.start()
    before, _ = run(played, 4.0)
    played.pause()
    strains, _ = run(played, 20.0)
    above = np.concatenate([before, strains])[:, 0] > 0.15
    assert above.sum() * DT <= 7.0
    assert above.sum() * DT > 5.5
    assert strains[-1, 0] == pytest.approx(0.135)
    assert played.let_down == 2


def test_after_such_a_pause_the_fibers_are_brought_back_before_the_score_goes_on(transport):
    played = transport(max_hold_s=7.0)
    played.start()
    run(played, 4.0)
    played.pause()
    run(played, 20.0)
    at = played.position_s
    played.go_on()
    assert played.phase == "bringing"
    while played.phase == "bringing":
        played.tick(DT)
    assert played.position_s == at and np.all(played.strain == 0.3) and played.let_down == 0


def test_a_short_pause_that_makes_a_hold_too_long_lets_the_fiber_down_in_mid_score(transport):
    played = transport(max_hold_s=8.5)
    played.start()
    before, _ = run(played, 4.0)
    played.pause()
    paused, _ = run(played, 3.0)
    played.go_on()
    after, _ = run(played, 20.0, until="end")
    strains = np.concatenate([before, paused, after])
    above = (strains[:, 0] > 0.15).sum() * DT
    assert 6.0 < above <= 8.5
    assert np.all(strains[-1] == 0.0)
    _, down = fastest(strains)
    assert down <= 0.3 + 1e-6


def test_a_hold_within_its_limit_is_played_as_written_where_there_was_no_pause(transport, make_rig, make_tracks):
    played = transport(max_hold_s=9.2)
    played.start()
    strains, _ = run(played, 20.0, until="end")
    tracks = make_tracks(2, [(1.0, 3.0, 0.3), (9.0, 13.0, 0.0)], duration_s=15.0)
    wanted = strain_at(tracks, abilities_of(make_rig(2)), (np.arange(len(strains)) + 1) * DT)
    assert np.abs(strains - wanted.T).max() < 1e-9


@pytest.mark.parametrize("at_s", [1.3, 1.6, 2.0, 2.5, 2.8])
def test_easing_to_a_stand_keeps_within_the_acceleration_that_a_move_uses_up_already(transport, at_s):
    # A smooth move of 0.3 in 2 s needs 10/sqrt(3) * 0.3 / 4 = 0.433 1/s².
    played = transport(accel=0.44)
    played.start()
    before, _ = run(played, at_s)
    played.pause()
    strains, _ = run(played, 3.0)
    assert played.phase == "standing"
    bends = np.abs(np.diff(np.concatenate([before, strains])[:, 0], 2)) / DT**2
    assert bends.max() <= 0.44 * 1.03


def test_a_last_move_that_ends_with_the_score_is_played_to_its_end(transport):
    played = transport(moves=[(0.0, 2.0, 0.3)], duration_s=2.0)
    played.start()
    strains, happened = run(played, 10.0, until="end")
    assert happened == {399: "end"} and np.all(strains[-1] == 0.3)
