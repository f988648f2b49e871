"""Passages solved apart, and programmes that grow in the solver, against solving all at once from nothing."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.retime.flow import ENDLESS
from composer.retime.parts import Parts
from composer.retime.programme import Programme, solve
from composer.retime.rows import MOVE_ROW
from composer.retime.stage import stage_of
from composer.retime.terms import contract, tilted

from .scores import random_score, tracks_of


def whole_of(rig, tracks, rhythm=False):
    stage = stage_of(tracks, abilities_of(rig), np.empty(0), np.empty(0), None, rhythm)
    priced, _ = tilted(stage.events, stage.terms)
    every = np.ones(len(stage.events.written_s), dtype=bool)
    return stage.rows, np.arange(len(stage.rows.least)), np.flatnonzero(every), contract(stage.events, priced, every)


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 10_000), st.booleans())
def test_a_programme_that_grows_row_by_row_ends_at_the_same_optimum(make_rig, seed, rhythm):
    rows, chosen, events, terms = whole_of(make_rig(4), random_score(seed).tracks, rhythm)
    # Without the rows of some moves at first: those of starts that then need a balance of their own among them.
    rng = np.random.default_rng(seed)
    left_out = chosen[(rows.kind == MOVE_ROW) & (rng.random(len(chosen)) < 0.5)]
    fewer = np.setdiff1d(chosen, left_out)
    programme = Programme(rows, fewer, events, terms)
    programme.solve(rows)
    for end in range(1, len(left_out) + 1, 2):
        assert programme.grow(rows, np.sort(np.concatenate((fewer, left_out[:end]))), events, terms)
        programme.solve(rows)
    assert programme.grow(rows, chosen, events, terms)
    grown, fresh = programme.solve(rows), solve(rows, chosen, events, terms)
    assert grown.bound == pytest.approx(fresh.bound, abs=1e-8)
    assert grown.shift_s == pytest.approx(fresh.shift_s, abs=1e-7)
    assert np.all(rows.matrix @ grown.shift_s >= rows.least - 1e-9)
    assert grown.dual @ rows.least == pytest.approx(grown.bound, abs=1e-9)


def test_a_programme_does_not_grow_where_something_given_has_gone(make_rig):
    rows, chosen, events, terms = whole_of(make_rig(4), random_score(3).tracks)
    programme = Programme(rows, chosen, events, terms)
    assert not programme.grow(rows, chosen[1:], events, terms)


def test_passages_apart_cost_what_they_do_together_and_only_what_changed_is_solved_again(make_rig, monkeypatch):
    passage = [(0.0, 0.3, "linear"), (0.25, 0.0, "linear"), (2.0, None, "hold")]
    track = [(100.0 * n + at, to, how) for n in range(3) for at, to, how in passage]
    rows, chosen, events, terms = whole_of(make_rig(1), tracks_of([[*track, (300.0, 0.1, "linear"), (301.0, None, "end")]]))
    fresh = solve(rows, chosen, events, terms)
    monkeypatch.setattr("composer.retime.parts.BUNDLE", 1)
    solved = []
    plain = Programme.solve
    monkeypatch.setattr(Programme, "solve", lambda self, *more: solved.append(len(self.events)) or plain(self, *more))
    # The order of hits, and the rests, bind nowhere between the passages: without these rows they share none.
    apart = chosen[[not _reaches(rows, row) for row in chosen]]
    parts = Parts()
    found = parts.solve(rows, apart, events, terms, ENDLESS)
    assert found.bound == pytest.approx(fresh.bound)
    assert found.shift_s == pytest.approx(fresh.shift_s, abs=1e-9)
    count = len(solved)
    assert count >= 3
    again = parts.solve(rows, apart, events, terms, ENDLESS)
    assert len(solved) == count
    assert np.array_equal(again.shift_s, found.shift_s)


def _reaches(rows, row):
    """Whether a row asks for far less than it has: rests of many seconds, and hits far apart."""
    return rows.least[row] < -50.0
