"""The fewest moves: against an exhaustive search, and by what is known of simple motions."""

from itertools import product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog

from composer.limits.abilities import abilities_of
from composer.shapes import NAMES, PROGRESS
from player.takes.places import UNIT

from .hands import governed, hand

TOLERANCE = 0.01
SHAPES = ("linear", "smooth", "swell", "settle")


def progress(shape, u):
    return np.polynomial.polynomial.polyval(u, PROGRESS[shape])


def motion(knots, shapes, step_s=0.005):
    """Shares every step through knots (time in s, share), with the shape of each move."""
    times = np.arange(round(knots[-1][0] / step_s) + 1) * step_s
    value = np.zeros(len(times))
    for (a_s, a), (b_s, b), shape in zip(knots[:-1], knots[1:], shapes, strict=True):
        inside = (times >= a_s) & (times <= b_s)
        value[inside] = a + (b - a) * progress(shape, (times[inside] - a_s) / (b_s - a_s))
    return times, value


def least_moves(times, value, every_s, most):
    """The least number of moves with knots at multiples of `every_s` and any values at all, by trying all of them."""
    places = np.arange(0.0, times[-1] + 1e-9, every_s)
    count = len(places)

    def rows(i, j, shape):
        inside = (times >= places[i] - 1e-9) & (times <= places[j] + 1e-9)
        w = progress(shape, (times[inside] - places[i]) / (places[j] - places[i]))
        return w, value[inside]

    def possible(i, j, shape):
        w, met = rows(i, j, shape)
        a = np.column_stack([1.0 - w, w])
        bounds = [(0.0, 0.0) if i == 0 else (0.0, 1.0), (0.0, 1.0)]
        found = linprog([0, 0], np.vstack([a, -a]), np.concatenate([met + TOLERANCE, TOLERANCE - met]), bounds=bounds)
        return found.status == 0

    single = {(i, j): [shape for shape in SHAPES if possible(i, j, shape)] for i in range(count) for j in range(i + 1, count)}

    def chains(i, left):
        if left == 0:
            if i == count - 1:
                yield []
            return
        for j in range(i + 1, count):
            if single[i, j]:
                for rest in chains(j, left - 1):
                    yield [(i, j), *rest]

    for moves in range(1, most + 1):
        for chain in chains(0, moves):
            for shapes in product(*(single[pair] for pair in chain)):
                a_rows, right = [], []
                for k, ((i, j), shape) in enumerate(zip(chain, shapes, strict=True)):
                    w, met = rows(i, j, shape)
                    block = np.zeros((len(w), moves + 1))
                    block[:, k], block[:, k + 1] = 1.0 - w, w
                    a_rows += [block, -block]
                    right += [met + TOLERANCE, TOLERANCE - met]
                bounds = [(0.0, 0.0), *[(0.0, 1.0)] * moves]
                if linprog(np.zeros(moves + 1), np.vstack(a_rows), np.concatenate(right), bounds=bounds).status == 0:
                    return moves
    raise AssertionError("more moves than were looked for")


def test_no_more_than_a_tenth_more_moves_than_the_least_there_can_be(make_rig, fitted):
    """Random motions of up to four moves, shaken by up to half of the tolerance, against every choice of knots and shapes."""
    rig = make_rig(1, fill=3.0, exhaust=3.0)
    rng = np.random.default_rng(7)
    found = least = 0
    for _ in range(14):
        inner = np.sort(rng.choice(np.arange(2, 9), size=int(rng.integers(0, 4)), replace=False)) * 0.15
        times_s = [0.0, *inner, 1.5]
        knots = [(t, 0.0 if t == 0.0 else float(rng.uniform(0.0, 1.0))) for t in times_s]
        times, value = motion(knots, rng.choice(SHAPES, size=len(knots) - 1))
        value = np.clip(value + 0.5 * TOLERANCE * np.sin(rng.uniform(5, 25) * times), 0.0, 1.0)
        value[0] = 0.0
        settled = fitted(rig, [value])
        assert settled.worst.max() <= TOLERANCE and settled.checked.ok
        found += settled.knots
        least += least_moves(times, value, 0.15, 4)
    assert found <= 1.1 * least


@pytest.mark.parametrize("shape", SHAPES)
def test_a_move_in_a_shape_of_the_language_is_found_again_as_it_was_written(make_rig, fitted, shape):
    _, value = motion([(0.0, 0.0), (0.5, 0.0), (2.0, 0.8), (3.0, 0.8)], ["linear", shape, "linear"])
    settled = fitted(make_rig(1, fill=3.0, exhaust=3.0), [value])
    (path,) = settled.paths
    moving = np.flatnonzero(np.abs(np.diff(path.share)) > 1e-9)
    assert path.moves <= 3 and [NAMES[path.shape[k]] for k in moving] == [shape]
    assert path.share[moving + 1] == pytest.approx([0.8], abs=TOLERANCE)


def test_a_hold_for_minutes_is_one_move(make_rig, fitted):
    settled = fitted(make_rig(1), [np.zeros(40_000)])
    assert settled.knots == 0
    _, value = motion([(0.0, 0.0), (2.0, 0.5), (200.0, 0.5)], ["smooth", "linear"])
    assert fitted(make_rig(1, fill=3.0), [value]).knots == 2


def test_a_fiber_that_goes_as_fast_as_it_can_is_written_as_sudden(make_rig, fitted):
    rig = make_rig(1, fill=0.6, exhaust=0.3)  # the whole stroke in 0.5 s up, in 1 s down
    times = np.arange(1001) * 0.005
    value = np.clip(np.minimum((times - 2.0) * 2.0, 0.9), 0.0, 1.0)
    (path,) = fitted(rig, [value]).paths
    assert [NAMES[shape] for shape in path.shape] == ["sudden", "linear"]
    assert path.time_s[1] == pytest.approx(2.45, abs=0.01)


def test_knots_lie_on_sixteenths_where_the_tolerance_lets_them(make_rig, fitted):
    _, value = motion([(0.0, 0.0), (1.0, 0.0), (3.25, 0.5), (5.5, 0.5), (8.0, 0.1)], ["linear", "smooth", "linear", "smooth"])
    (path,) = fitted(make_rig(1, fill=3.0, exhaust=3.0), [value]).paths
    assert np.all(path.place % (UNIT // 16) == 0)
    assert path.moves == 4


def test_targets_are_round_numbers(make_rig, fitted):
    _, value = motion([(0.0, 0.0), (2.0, 0.4987), (3.0, 0.4987)], ["smooth", "linear"])
    (path,) = fitted(make_rig(1, fill=3.0), [value]).paths
    assert path.share[-1] == pytest.approx(0.5, abs=1e-12)


def test_what_was_played_by_hand_and_governed_checks_clean_within_the_tolerance(make_rig, fitted):
    rig = make_rig(6, fill=0.6, exhaust=0.25, max_hold_s=9.0, duty=0.8)
    abilities = abilities_of(rig)
    _, let = governed(rig, abilities, np.array([hand(30.0, seed) for seed in range(6)]))
    settled = fitted(rig, let / abilities.stroke[:, None], counts=112.0)
    assert settled.checked.ok and settled.worst.max() <= TOLERANCE and not len(settled.late)


@settings(max_examples=25, deadline=None)
@given(
    seeds=st.lists(st.integers(0, 10_000), min_size=1, max_size=3),
    fill=st.floats(0.1, 3.0),
    exhaust=st.floats(0.1, 3.0),
    tolerance=st.sampled_from([0.005, 0.01, 0.03]),
    counts=st.sampled_from([30.0, 60.0, 97.0, 240.0]),
)
def test_whatever_is_played_is_fitted_within_the_tolerance_and_can_be_done(
    make_rig, fitted, seeds, fill, exhaust, tolerance, counts
):
    rig = make_rig(len(seeds), fill=fill, exhaust=exhaust)
    abilities = abilities_of(rig)
    _, let = governed(rig, abilities, np.array([hand(8.0, seed) for seed in seeds]))
    settled = fitted(rig, let / abilities.stroke[:, None], tolerance=tolerance, counts=counts)
    assert settled.checked.ok
    assert settled.worst.max() <= tolerance


def test_a_fiber_that_is_lifted_as_the_take_begins_goes_there_first(make_rig, fitted):
    rig = make_rig(2, fill=0.6)
    settled = fitted(rig, [np.full(1000, 0.6), np.zeros(1000)])
    assert settled.late.tolist() == [0] and settled.checked.ok
    assert settled.tracks.curve[settled.tracks.first[1] - 1, 0] == pytest.approx(0.18, abs=0.003)
