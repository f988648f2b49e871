"""The limit of duty."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.duty import on_time, shares, snags


def _find(tracks, rig):
    return snags(tracks, rig, abilities_of(rig))


def test_a_coil_may_be_on_for_its_burst_over_what_it_may_not_bear(make_rig, make_tracks):
    rig = make_rig(1, duty=0.5, duty_burst_s=2.0)
    assert _find(make_tracks([(4.0, 0.2, "linear")]), rig) == []
    (snag,) = _find(make_tracks([(5.0, 0.2, "linear")]), rig)
    assert (snag.from_s, snag.to_s, snag.needs, snag.has, snag.unit) == (0.0, 5.0, 5.0, 4.5, "s")
    assert (snag.fiber, snag.knot, snag.line) == (0, 0, 10)


def test_rest_between_moves_lets_a_coil_recover(make_rig, make_tracks):
    rig = make_rig(1, duty=0.5, duty_burst_s=2.0)
    rested = [(4.0, 0.2, "linear"), (4.0, 0.2, "hold"), (4.0, 0.0, "linear")]
    hasty = [(4.0, 0.2, "linear"), (3.0, 0.2, "hold"), (4.0, 0.0, "linear")]
    assert _find(make_tracks(rested), rig) == []
    (snag,) = _find(make_tracks(hasty), rig)
    assert (snag.from_s, snag.to_s, snag.needs, snag.has) == (0.0, 11.0, 8.0, 7.5)


def test_a_coil_that_may_be_on_for_ever_has_no_snag(make_rig, make_tracks):
    assert _find(make_tracks([(1e5, 0.2, "linear")]), make_rig(1, duty=1.0, duty_burst_s=0.0)) == []


def test_the_share_is_that_of_the_whole_score(make_rig, make_tracks):
    tracks = make_tracks([(2.0, 0.2, "linear")], [(1.0, 0.2, "linear")], duration_s=8.0)
    rig = make_rig(2)
    assert shares(tracks, rig, abilities_of(rig)).tolist() == [0.25, 0.125]


def test_on_time_rises_by_what_is_on_and_by_nothing_else(make_rig, make_tracks):
    rig = make_rig(2)
    tracks = make_tracks([(1.0, 0.0, "hold"), (2.0, 0.2, "linear"), (1.0, 0.2, "hold"), (1.0, 0.0, "linear")], [])
    on = on_time(tracks, rig, abilities_of(rig))
    assert on.first.tolist() == [0, 5, 6]
    assert on.time_s[:5].tolist() == [0.0, 1.0, 3.0, 4.0, 5.0]
    assert on.on_s[:5].tolist() == [0.0, 0.0, 2.0, 2.0, 3.0]
    assert on.segment[:5].tolist() == [-1, -1, 1, -1, 3]


@settings(deadline=None)
@given(
    st.lists(st.tuples(st.floats(0.1, 3.0), st.booleans()), min_size=1, max_size=12), st.floats(0.1, 0.9), st.floats(0.1, 4.0)
)
def test_a_coil_watched_in_small_steps_overheats_when_the_check_says(make_rig, make_tracks, parts, duty, burst):
    rig, at, moves = make_rig(1, duty=duty, duty_burst_s=burst), 0.0, []
    for seconds, moving in parts:
        at = (0.2 if at == 0.0 else 0.0) if moving else at
        moves.append((seconds, at, "linear" if moving else "hold"))
    warm, warmest = 0.0, 0.0
    for seconds, moving in parts:
        for _ in range(50):
            warm = max(0.0, warm + seconds / 50 * ((1.0 if moving else 0.0) - duty))
            warmest = max(warmest, warm)
    if abs(warmest - burst) > 0.1:
        assert bool(_find(make_tracks(moves), rig)) == (warmest > burst)
    found = _find(make_tracks(moves), rig)
    if found:
        assert max(s.needs - s.has for s in found) == pytest.approx(warmest - burst, abs=0.1)
    assert all(np.isfinite([s.needs, s.has]).all() for s in found)


def test_a_coil_of_each_duty_class_bears_its_share_of_every_period_and_no_more(make_rig, make_tracks, outside):
    for percent in outside["duty_classes"]["percent"]:
        share, period = percent / 100.0, 20.0
        rig = make_rig(1, duty=share, duty_burst_s=share * (1.0 - share) * period)

        def periods(on_s, period=period):
            off_s = period - on_s
            return [(on_s, 0.2, "linear"), (off_s, 0.2, "hold"), (on_s, 0.0, "linear"), (off_s, 0.0, "hold")] * 3

        assert _find(make_tracks(periods(share * period)), rig) == []
        if percent < 100:
            assert _find(make_tracks(periods(1.02 * share * period)), rig) != []
