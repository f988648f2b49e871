"""The strain that a make would have shown, against the equations solved in small steps by themselves."""

from dataclasses import replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.fiber.contractile import Contractile
from composer.fit.model import drive_of, edges, lagged, played, strain_on

from . import synthetic


def shape(true=synthetic.TRUE):
    return Contractile(max_pressure_kPa=450.0, **true).shape()


def test_the_modelled_strain_is_that_of_the_equations_in_small_steps(clean, as_bench):
    drive = drive_of(as_bench(clean), synthetic.LOAD_N)
    braid = shape()
    strain = strain_on(drive, braid, braid.stop, 0.04, 0.015)
    # Between rows 5 ms apart the model's pressure goes straight; corners within a row are all that is lost.
    assert np.sqrt(np.mean((strain - clean[2]) ** 2)) < 1e-4
    assert np.max(np.abs(strain - clean[2])) < 0.003


def test_a_load_measured_row_by_row_that_never_changes_is_the_constant_load(clean, as_bench):
    drive = drive_of(as_bench(clean), 4.0)
    each = replace(drive, load=np.full(len(drive.time), 4.0))
    braid = shape()
    for one, other in zip(edges(drive, braid, braid.stop, 0.04), edges(each, braid, braid.stop, 0.04), strict=True):
        np.testing.assert_allclose(one, other, atol=1e-9)


def test_more_load_means_less_strain(clean, as_bench):
    drive = drive_of(as_bench(clean), 4.0)
    braid = shape()
    light = strain_on(drive, braid, braid.stop, 0.04, 0.0)
    heavy = strain_on(replace(drive, load=np.linspace(5.0, 9.0, len(drive.time))), braid, braid.stop, 0.04, 0.0)
    assert np.all(heavy <= light + 1e-12) and heavy.max() < light.max()


def test_small_reversals_within_the_friction_band_do_nothing(as_bench):
    time = np.arange(1200) / 100.0
    pressure = np.interp(time, [0, 4, 5, 6, 7, 12], [0, 300, 292, 300, 292, 292])
    drive = drive_of(as_bench((time, pressure, np.zeros(1200) + 0.01 * (time > 1))), 4.0)
    braid = shape()
    strain = strain_on(drive, braid, braid.stop, 0.04, 0.0)
    assert np.ptp(strain[time > 4.01]) < 1e-9


@given(st.floats(0.0, 0.4))
def test_friction_keeps_strain_between_its_two_branches(clean_drive, friction):
    braid = shape()
    edge_in, edge_out = edges(clean_drive, braid, braid.stop, friction)
    strain = played(clean_drive, edge_in, edge_out)
    assert np.all(strain >= edge_in - 1e-12) and np.all(strain <= edge_out + 1e-12)


def test_a_lag_follows_a_step_as_an_exponential_does():
    time = np.arange(400) / 1000.0
    strain = np.where(time > 0.0995, 0.2, 0.0)
    late = lagged(time, strain, 0.02)
    after = time >= 0.1
    # The step goes straight through one row, so it counts from its middle.
    np.testing.assert_allclose(late[after], 0.2 * (1.0 - np.exp(-(time[after] - 0.0995) / 0.02)), atol=2e-4)


def test_a_lag_follows_a_ramp_its_own_time_behind():
    time = np.arange(1000) / 500.0
    np.testing.assert_allclose(lagged(time, 0.1 * time, 0.05)[500:], (0.1 * (time - 0.05))[500:], atol=1e-9)


def test_no_lag_changes_nothing_and_a_tiny_one_next_to_nothing():
    time = np.arange(100) / 100.0
    strain = np.sin(3.0 * time)
    assert lagged(time, strain, 0.0) is strain
    np.testing.assert_allclose(lagged(time, strain, 1e-8), strain, atol=1e-7)


@settings(deadline=None)
@given(st.lists(st.tuples(st.floats(1e-4, 1.0), st.floats(0.0, 0.4)), min_size=2, max_size=50), st.floats(0.0, 2.0))
def test_a_lag_never_leaves_the_range_of_what_it_follows(rows, settle):
    step, strain = np.array(rows).T
    late = lagged(np.cumsum(step), strain, settle)
    assert late.min() >= strain.min() - 1e-9 and late.max() <= strain.max() + 1e-9
