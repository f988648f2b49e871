"""When a coil is energised."""

from composer.limits.abilities import abilities_of
from composer.limits.coil import on_times


def _on(tracks, rig):
    on = on_times(tracks, rig, abilities_of(rig))
    return list(zip(on.fiber.tolist(), on.from_s.tolist(), on.seconds.tolist(), on.stretch.tolist(), strict=True))


SCORE = [(1.0, 0.2, "linear"), (2.0, 0.2, "hold"), (1.0, 0.1, "smooth"), (1.0, 0.0, "smooth"), (3.0, 0.0, "hold")]


def test_a_coil_is_on_while_its_fiber_moves(make_rig, make_tracks):
    assert _on(make_tracks(SCORE), make_rig(1)) == [(0, 0.0, 1.0, 0), (0, 3.0, 1.0, 1), (0, 4.0, 1.0, 1)]


def test_a_coil_that_holds_is_on_above_rest_too(make_rig, make_tracks):
    on = _on(make_tracks(SCORE), make_rig(1, energised_while_holding=True))
    assert on == [(0, 0.0, 1.0, 0), (0, 1.0, 2.0, 0), (0, 3.0, 1.0, 0), (0, 4.0, 1.0, 0)]


def test_holding_at_the_end_counts_up_to_the_scores_end(make_rig, make_tracks):
    tracks = make_tracks([(1.0, 0.2, "linear")], duration_s=5.0)
    assert _on(tracks, make_rig(1, energised_while_holding=True)) == [(0, 0.0, 1.0, 0), (0, 1.0, 4.0, 0)]


def test_a_jump_starts_a_coil_unless_it_is_too_small_for_the_drive(make_rig, make_tracks):
    tracks = make_tracks(
        [(1.0, 0.0, "hold"), (0.0, 0.2, "step"), (1.0, 0.2, "hold"), (0.0, 0.2 + 1e-7, "step"), (1.0, 0.2, "hold")]
    )
    assert _on(tracks, make_rig(1)) == [(0, 1.0, 0.0, 0)]
