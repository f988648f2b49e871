"""The limit of holding."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.limits.hold import runs_above_half, snags


def _find(tracks, rig):
    return snags(tracks, rig, abilities_of(rig))


def test_time_above_half_counts_the_parts_of_the_moves_around_the_hold(make_rig, make_tracks):
    tracks = make_tracks([(2.0, 0.3, "linear"), (3.0, 0.3, "hold"), (4.0, 0.0, "linear")])
    (snag,) = _find(tracks, make_rig(1, stroke=0.3, max_hold_s=5.0))
    assert (snag.from_s, snag.to_s, snag.needs, snag.has, snag.unit) == pytest.approx((1.0, 7.0, 6.0, 5.0, "s"), abs=1e-6)
    assert _find(tracks, make_rig(1, stroke=0.3, max_hold_s=6.0)) == []


def test_the_runs_give_each_segment_with_its_share(make_rig, make_tracks):
    tracks = make_tracks(
        [(2.0, 0.3, "linear"), (3.0, 0.3, "hold"), (4.0, 0.0, "linear"), (1.0, 0.0, "hold"), (1.0, 0.2, "linear")],
        duration_s=13.0,
    )
    runs = runs_above_half(tracks, abilities_of(make_rig(1, stroke=0.3, max_hold_s=5.0)))
    assert runs.run.tolist() == [0, 0, 0, 1, 1]
    assert runs.segment.tolist() == [0, 1, 2, 4, 5]
    assert runs.share == pytest.approx([0.5, 1.0, 0.5, 0.25, 1.0], abs=1e-6)


def test_a_hold_at_the_end_lasts_to_the_end_of_the_score(make_rig, make_tracks):
    (snag,) = _find(make_tracks([(1.0, 0.3, "linear")], duration_s=11.0), make_rig(1, max_hold_s=5.0))
    assert (snag.to_s, snag.line) == (11.0, 10)


def test_the_line_to_blame_is_that_of_the_longest_part_and_not_of_the_last(make_rig, make_tracks):
    tracks = make_tracks([(2.0, 0.3, "linear"), (9.0, 0.3, "hold"), (1.0, 0.25, "linear"), (2.0, 0.25, "hold")])
    (snag,) = _find(tracks, make_rig(1, stroke=0.3, max_hold_s=5.0))
    assert snag.knot == 1


def test_half_stroke_itself_is_not_above_half(make_rig, make_tracks):
    assert _find(make_tracks([(1.0, 0.15, "linear")], duration_s=99.0), make_rig(1, stroke=0.3, max_hold_s=5.0)) == []


def test_a_fiber_without_a_longest_hold_holds_for_ever(make_rig, make_tracks):
    tracks = make_tracks([(1.0, 0.3, "linear")], duration_s=1e6)
    assert _find(tracks, make_rig(1)) == []
    assert len(runs_above_half(tracks, abilities_of(make_rig(1))).run) == 0


def test_a_dip_below_half_begins_a_new_run(make_rig, make_tracks):
    tracks = make_tracks([(1.0, 0.3, "step"), (3.0, 0.3, "hold"), (0.2, [0.3, -0.8, 0.8, 0, 0, 0]), (3.0, 0.3, "hold")])
    runs = runs_above_half(tracks, abilities_of(make_rig(1, stroke=0.3, max_hold_s=5.0)))
    assert runs.run.max() == 1


@settings(deadline=None)
@given(
    st.lists(
        st.tuples(st.floats(0.1, 2.0), st.floats(0.0, 0.3), st.sampled_from(["smooth", "linear", "swell", "settle"])),
        max_size=5,
    )
)
def test_the_time_of_all_runs_is_the_time_that_samples_lie_above_half(make_rig, make_tracks, moves):
    tracks = make_tracks(moves)
    runs = runs_above_half(tracks, abilities_of(make_rig(1, stroke=0.3, max_hold_s=0.01)))
    u = (np.arange(4000) + 0.5) / 4000
    sampled = sum(moves[k][0] * np.mean(np.polyval(tracks.curve[k][::-1], u) > 0.15 + 1e-9) for k in range(len(moves)))
    assert (runs.to_s - runs.from_s).sum() == pytest.approx(sampled, abs=2e-3 * (1 + len(moves)))
