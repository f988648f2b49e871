"""From a thread to the line that moves it, and back."""

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from composer.edits.threads import moved_by, source_at, threads_of
from composer.faults import Faults
from composer.tracks import HOLD

from ..score.random_scores import scores
from .making import DEMOS, demo, made

TEXT = """\
tempo 60
phrase up 4
  1 rest
  2 0.5 smooth
  4 rest over 1
section s at 2:1
  r.1, r.2 up
  r.1 up after 2
  r.3 up after 4 times 2
"""


def stretches(threads, line) -> list[tuple[int, float, float]]:
    found = moved_by(threads, line)
    return list(zip(found.fiber.tolist(), found.from_s.tolist(), found.to_s.tolist(), strict=True))


def test_an_entry_moves_its_fibers_from_first_move_to_last_or_until_another_takes_over(make_rig):
    threads = threads_of(made(TEXT, make_rig(4)))
    assert stretches(threads, 7) == [(0, 5.0, 6.0), (1, 5.0, 8.0)]


def test_a_line_of_a_phrase_moves_everyone_who_plays_it(make_rig):
    threads = threads_of(made(TEXT, make_rig(4)))
    assert stretches(threads, 4) == [(0, 5.0, 6.0), (0, 7.0, 8.0), (1, 5.0, 6.0), (2, 9.0, 10.0), (2, 13.0, 14.0)]
    assert stretches(threads, 2) == [(0, 5.0, 10.0), (1, 5.0, 8.0), (2, 9.0, 12.0), (2, 13.0, 16.0)]
    assert stretches(threads, 6) == stretches(threads, 2)


def test_a_line_that_moves_nothing_moves_nothing(make_rig):
    threads = threads_of(made(TEXT, make_rig(4)))
    assert stretches(threads, 1) == stretches(threads, 99) == stretches(threads, 0) == []


def test_a_click_finds_the_entry_and_the_phrases_line(make_rig):
    threads = threads_of(made(TEXT, make_rig(4)))
    source = source_at(threads, 0, 5.5)
    assert (source.line, source.phrase_line, source.from_s, source.to_s) == (7, 4, 5.0, 6.0)
    assert (source.entry.line, source.move.line) == (7, 4)
    assert source_at(threads, 0, 7.5).line == 8
    assert source_at(threads, 0, 99.0).line == 8
    assert source_at(threads, 0, 1.0) is None
    assert source_at(threads, 3, 5.0) is None


def test_where_a_phrase_is_another_files_the_entry_is_found_alone(make_rig):
    text = "use w.score\nsection s at 1:1\n  r.1 p\n"
    threads = threads_of(made(text, make_rig(1), {"w.score": "phrase p\n  1 rest\n  2 0.5\n"}))
    source = source_at(threads, 0, 1.5)
    assert (source.line, source.phrase_line, source.move) == (3, 0, None)


@pytest.mark.parametrize("name", DEMOS)
def test_in_the_demo_scores_every_moving_segment_lies_within_what_its_lines_move(name):
    state = demo(name)
    threads, tracks = threads_of(state), state.tracks
    moving = np.flatnonzero(tracks.manner != HOLD)
    fiber = np.repeat(np.arange(tracks.fibers), np.diff(tracks.first))
    for line in np.unique(tracks.line[moving]).tolist():
        found = moved_by(threads, line)
        for k in moving[tracks.line[moving] == line].tolist():
            mine = found.fiber == fiber[k]
            assert np.any((found.from_s[mine] <= tracks.time_s[k] + 1e-9) & (found.to_s[mine] >= tracks.time_s[k + 1] - 1e-9))


@settings(max_examples=25, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores(), at=st.floats(0.0, 60.0), fiber=st.integers(0, 3))
def test_whatever_is_found_at_an_instant_is_what_moves_then(make_rig, text, at, fiber):
    try:
        state = made(text, make_rig(4))
    except Faults:
        assume(False)
    threads = threads_of(state)
    source = source_at(threads, fiber, at)
    if source is None:
        return
    assert source.from_s <= at
    assert state.tracks.line[source.segment] == source.line
    if state.tracks.manner[source.segment] != HOLD and source.to_s > source.from_s:
        found = moved_by(threads, source.line)
        assert fiber in found.fiber.tolist()
