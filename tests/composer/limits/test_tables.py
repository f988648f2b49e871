"""Rate tables against closed forms, quadrature and themselves."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from composer.fiber.capability import Capability
from composer.limits.abilities import Abilities, abilities_of
from composer.limits.tables import rates, strain_after, travel_time_s


def _abilities(*tables: tuple[list[float], list[float], list[float]]) -> Abilities:
    """One fiber for each (strain, fill, exhaust), all tables of one length."""
    strain, fill, exhaust = (np.array([t[n] for t in tables], dtype=float) for n in range(3))
    count = len(tables)
    capabilities = tuple(
        Capability(s[-1], "contract", 400.0, None, s, f, e, np.inf, s * 0.01, None)
        for s, f, e in zip(strain, fill, exhaust, strict=True)
    )
    ones = np.ones(count)
    return Abilities(
        capabilities, np.arange(count), strain[:, -1], np.inf * ones, 400 * ones, np.nan * ones, np.inf * ones,
        strain, fill, exhaust, strain * 0.01,
    )  # fmt: skip


THREE = _abilities(
    ([0.0, 0.1, 0.2, 0.3], [0.6, 0.5, 0.3, 0.1], [0.05, 0.2, 0.4, 0.5]),
    ([0.0, 0.3, 0.5, 0.9], [1.0, 1.0, 2.0, 0.5], [0.3, 0.3, 0.3, 0.3]),
    ([0.0, 0.01, 0.02, 0.03], [5.0, 1e-3, 5.0, 1.0], [1.0, 2.0, 3.0, 4.0]),
)


def test_a_constant_rate_takes_distance_over_rate(make_rig):
    abilities = abilities_of(make_rig(2, stroke=0.3, fill=0.6, exhaust=0.3))
    assert travel_time_s(abilities, [0, 1, 0], [0.0, 0.3, 0.1], [0.3, 0.0, 0.1]) == pytest.approx([0.5, 1.0, 0.0], rel=1e-14)


def test_a_rate_that_grows_with_strain_takes_a_logarithm_of_time():
    abilities = _abilities(([0.0, 1.0], [1.0, 3.0], [2.0, 2.0]))
    assert travel_time_s(abilities, [0], [0.0], [1.0]) == pytest.approx([np.log(3.0) / 2.0], rel=1e-14)
    assert strain_after(abilities, [0], [0.0], [1.0], [0.25]) == pytest.approx([(np.exp(0.5) - 1.0) / 2.0], rel=1e-14)


def test_beyond_its_table_a_fiber_keeps_the_rate_of_the_end():
    assert rates(THREE, np.array([0, 0]), np.array([-0.1, 0.5]), np.array([True, True])) == pytest.approx([0.6, 0.1])
    assert travel_time_s(THREE, [0, 0], [0.3, 0.0], [0.4, -0.1]) == pytest.approx([1.0, 2.0], rel=1e-12)
    assert strain_after(THREE, [0, 0], [0.3, 0.0], [0.4, -0.1], [0.5, 1.0]) == pytest.approx([0.35, -0.05], rel=1e-12)


def test_a_way_of_a_millionth_loses_no_digits():
    (time,) = travel_time_s(THREE, [1], [0.899], [0.899 + 1e-9])
    assert time == pytest.approx(((0.899 + 1e-9) - 0.899) / np.interp(0.899, THREE.strain[1], THREE.fill[1]), rel=1e-8)


ways = st.tuples(st.integers(0, 2), st.floats(-0.2, 1.2), st.floats(-0.2, 1.2))


@given(st.lists(ways, min_size=1, max_size=8))
def test_travel_time_is_the_integral_of_strain_over_rate(asked):
    fiber, a, b = (np.array(x) for x in zip(*asked, strict=True))
    a, b = a * THREE.stroke[fiber], b * THREE.stroke[fiber]
    for f, start, end, time in zip(fiber, a, b, travel_time_s(THREE, fiber, a, b), strict=True):
        table = (THREE.fill if end > start else THREE.exhaust)[f]
        inner = sorted((s for s in THREE.strain[f] if min(start, end) < s < max(start, end)), reverse=bool(end < start))
        exact = sum(
            abs(quad(lambda s, t=table, f=f: 1.0 / np.interp(s, THREE.strain[f], t), p, q, epsabs=1e-13, epsrel=1e-11)[0])
            for p, q in pairwise([start, *inner, end])
        )
        assert time == pytest.approx(exact, rel=1e-8, abs=1e-14)


@given(st.lists(st.tuples(ways, st.floats(0.0, 1.0)), min_size=1, max_size=8))
def test_the_strain_after_a_share_of_the_time_is_that_time_away(asked):
    fiber, a, b = (np.array(x) for x in zip(*[way for way, _ in asked], strict=True))
    a, b = a * THREE.stroke[fiber], b * THREE.stroke[fiber]
    elapsed = np.array([share for _, share in asked]) * travel_time_s(THREE, fiber, a, b)
    there = strain_after(THREE, fiber, a, b, elapsed)
    assert np.all((there >= np.minimum(a, b)) & (there <= np.maximum(a, b)))
    assert travel_time_s(THREE, fiber, a, there) == pytest.approx(elapsed, rel=1e-6, abs=1e-9)


def test_a_fiber_that_has_arrived_stays():
    assert strain_after(THREE, [0, 0], [0.0, 0.3], [0.2, 0.1], [1e9, np.inf]).tolist() == [0.2, 0.1]
