"""Chains between pins that are too close."""

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog

from composer.limits.abilities import abilities_of
from composer.retime.pins import chains_too_long
from composer.retime.retiming import retime
from composer.retime.rows import HOLD_ROW, MOVE_ROW
from composer.retime.stage import stage_of
from composer.tracks import SUDDEN

from .scores import random_score, tracks_of


def chains(rig, fibers, pins, give=None):
    pins = np.array(pins)
    give = np.zeros(len(pins)) if give is None else np.array(give)
    stage = stage_of(tracks_of(fibers), abilities_of(rig), pins, give, None, False)
    return chains_too_long(stage.events, stage.rows, pins, give)


def test_pins_with_room_enough_have_no_chain(make_rig):
    assert chains(make_rig(1), [[(0.0, 0.3, "linear"), (0.5, None, "end")]], [0.5]) == []


def test_a_chain_names_its_pins_its_moves_and_what_is_lacking(make_rig):
    track = [(0.0, 0.3, "linear"), (0.6, 0.0, "linear"), (1.2, 0.3, "linear"), (1.4, None, "end")]
    (chain,) = chains(make_rig(1), [track], [0.6, 1.4])
    assert (chain.from_pin, chain.to_pin, chain.from_s, chain.to_s) == (0, 1, 0.6, 1.4)
    assert chain.knots == (1, 2)
    assert chain.short_s == pytest.approx(1.0 + 0.5 - 0.8)


def test_a_chain_may_go_through_several_fibers(make_rig):
    first = [(0.0, 0.3, "linear"), (0.2, None, "end")]
    second = [(0.0, 0.03, "linear"), (0.2, 0.3, "linear"), (0.5, None, "end")]
    (chain,) = chains(make_rig(2), [first, second], [0.5])
    assert chain.knots == (0, 3)
    assert chain.short_s == pytest.approx(0.5 + 0.45 - 0.5)


def test_each_pair_of_pins_tells_its_own_lack(make_rig):
    track = [(0.0, 0.3, "linear"), (0.4, 0.0, "linear"), (1.2, None, "end")]
    found = chains(make_rig(1), [track], [0.4, 1.2])
    assert [round(chain.short_s, 9) for chain in found] == [0.1, 0.2]


def test_give_at_a_pin_is_counted(make_rig):
    track = [(0.0, 0.3, "linear"), (0.4, None, "end")]
    assert chains(make_rig(1), [track], [0.4], [0.1]) == []
    (chain,) = chains(make_rig(1), [track], [0.4], [0.05])
    assert chain.short_s == pytest.approx(0.05)


def solved(tracks, rig, pins, give):
    """Whether times exist that keep what is pinned, by a programme of its own over the rows alone."""
    stage = stage_of(tracks, abilities_of(rig), pins, give, None, False)
    return stage, feasible(stage.rows.matrix, stage.rows.least)


def feasible(matrix, least):
    count = matrix.shape[1]
    found = linprog(np.zeros(count), A_ub=-matrix, b_ub=-least, bounds=(None, None), method="highs")
    return found.status == 0


@settings(max_examples=40, deadline=None)
@example(300)
@given(st.integers(0, 10_000))
def test_a_conflict_holds_dissolves_without_either_pin_and_asks_for_less_without_any_of_its_moves(make_rig, seed):
    rig = make_rig(4)
    tracks, pins = random_score(seed, moves=4).tracks, np.sort(random_score(seed + 1, moves=4).pins_s)
    pins = np.unique(np.append(pins, tracks.time_s.max() / 2.0))
    give = np.zeros(len(pins))
    stage, fits = solved(tracks, rig, pins, give)
    found = chains_too_long(stage.events, stage.rows, pins, give)
    assert bool(found) != fits
    for chain in found:
        # Only the moves and pins that the conflict names, with rests and the order of hits, which are no one's to change.
        mine = np.isin(pins, [chain.from_s, chain.to_s])
        alone = stage_of(tracks, abilities_of(rig), pins[mine], give[mine], None, False)
        named = (alone.rows.kind != MOVE_ROW) | np.isin(alone.rows.knot, chain.knots)
        matrix, least = alone.rows.matrix[named], alone.rows.least[named].copy()
        assert not feasible(matrix, least)
        # Without any one of the moves less time would do; often none more, but one may be too long by itself as well.
        less = give[mine].copy()
        less[-1] = 0.999 * chain.short_s
        nearly = stage_of(tracks, abilities_of(rig), pins[mine], less, None, False)
        for knot in chain.knots:
            # A sudden move's time is asked for by the row of the hold before it.
            asks = (HOLD_ROW, knot - 1) if nearly.tracks.manner[knot] == SUDDEN else (MOVE_ROW, knot)
            part = (nearly.rows.kind != MOVE_ROW) | np.isin(nearly.rows.knot, chain.knots)
            assert not feasible(nearly.rows.matrix[part], nearly.rows.least[part])
            part &= (nearly.rows.kind != asks[0]) | (nearly.rows.knot != asks[1])
            assert feasible(nearly.rows.matrix[part], nearly.rows.least[part])
        for place in np.flatnonzero(mine):
            fewer = mine.copy()
            fewer[place] = False
            other = stage_of(tracks, abilities_of(rig), pins[fewer], give[fewer], None, False)
            part = (other.rows.kind != MOVE_ROW) | np.isin(other.rows.knot, chain.knots)
            assert feasible(other.rows.matrix[part], other.rows.least[part])
        # With so many seconds more at the later pin they fit, with less they do not.
        for share, fit in ((1.0 + 1e-6, True), (0.99, False)):
            more = give[mine].copy()
            more[-1] = share * chain.short_s
            relaxed = stage_of(tracks, abilities_of(rig), pins[mine], more, None, False)
            part = (relaxed.rows.kind != MOVE_ROW) | np.isin(relaxed.rows.knot, chain.knots)
            assert feasible(relaxed.rows.matrix[part], relaxed.rows.least[part]) == fit


def test_the_factor_told_fits_and_a_larger_one_does_not(make_rig):
    track = [(0.0, 0.3, "linear"), (0.6, 0.0, "linear"), (1.2, 0.3, "linear"), (1.4, None, "end")]
    tracks = tracks_of([track])
    rig = make_rig(1)
    (short,) = retime(tracks, abilities_of(rig), rig, np.array([0.6, 1.4])).pins_short
    # A second and a half are wanted for what has 0.8 s.
    assert short.factor == pytest.approx(0.8 / 1.5, rel=1e-6)
