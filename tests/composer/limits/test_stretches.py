"""Pieces become snags."""

import numpy as np

from composer.limits.stretches import Pieces, as_snags, gather, line_of


def _pieces(*rows):
    columns = [np.array(c) for c in zip(*rows, strict=True)]
    return Pieces(*columns)


def test_touching_pieces_of_one_fiber_are_one_snag_told_by_the_worst(make_tracks):
    tracks = make_tracks([(1.0, 0.1, "linear"), (1.0, 0.2, "linear")], [(1.0, 0.1, "linear")])
    found = as_snags(
        "rate",
        "1/s",
        gather(
            _pieces((0, 1.0, 1.5, 3.0, 1.0, 1, True)),
            _pieces((0, 0.2, 1.0, 2.0, 1.0, 0, False), (1, 0.2, 1.0, 2.0, 1.0, 3, True)),
        ),
        tracks,
    )
    assert [(s.fiber, s.from_s, s.to_s, s.needs, s.knot, s.line, s.mends) for s in found] == [
        (0, 0.2, 1.5, 3.0, 1, 11, False),
        (1, 0.2, 1.0, 2.0, 3, 10, True),
    ]


def test_pieces_with_time_between_are_two_snags(make_tracks):
    tracks = make_tracks([(1.0, 0.1, "linear")])
    found = as_snags("rate", "1/s", _pieces((0, 0.0, 0.4, 2.0, 1.0, 0, True), (0, 0.5, 0.6, 2.0, 1.0, 0, True)), tracks)
    assert [(s.from_s, s.to_s) for s in found] == [(0.0, 0.4), (0.5, 0.6)]


def test_a_hold_is_owed_to_the_line_that_led_into_it(make_tracks):
    tracks = make_tracks([(1.0, 0.0, "hold")], [(1.0, 0.1, "linear"), (2.0, 0.1, "hold")])
    assert line_of(tracks, 4) == 10
    assert line_of(tracks, 0) == 0
