"""Fits of modelled makes: the true values within what the fit says of itself."""

import numpy as np
import pytest

from composer.faults import Faults
from composer.fit.fitting import fit
from composer.fit.reading import read_bench

from . import synthetic

SLEEVE = {
    "rest_length_mm": 200.0,
    "outer_diameter_mm": 6.0,
    "wall_mm": 1.0,
    "shear_modulus_kPa": 100.0,
    "friction_fraction": 0.06,
    "settle_ms": 30.0,
    "sleeve_limit": 1.2,
}
SLEEVE_HEAD = """\
# kind = "extensile"
# rest_length_mm = 200
# outer_diameter_mm = 6
# wall_mm = 1.0
# load_N = 0.5
"""


def found(fitted):
    return {one.key: one for one in fitted.found}


def holds(fitted, true):
    return all(one.low <= true[one.key] <= one.high for one in fitted.found)


@pytest.fixture(scope="module")
def twelve(clean, as_bench):
    """Fits of twelve noisy repeats."""
    return [fit(as_bench(synthetic.noisy(clean, seed)), "reed") for seed in range(12)]


def test_the_true_values_lie_within_the_stated_uncertainty_in_ten_of_twelve_repeats(twelve):
    # At the stated 0.95 fewer than 10 of 12 would come by chance once in 50; the seeds are fixed, so it does not come and go.
    assert sum(holds(fitted, synthetic.TRUE) for fitted in twelve) >= 10


@pytest.mark.soak
@pytest.mark.timeout(1200)
def test_the_true_values_lie_within_the_stated_uncertainty_in_ninety_of_a_hundred_repeats(clean, as_bench):
    fits = (fit(as_bench(synthetic.noisy(clean, seed)), "reed") for seed in range(5000, 5100))
    assert sum(holds(fitted, synthetic.TRUE) for fitted in fits) >= 90


def test_a_bench_without_noise_gives_the_true_values(clean, as_bench):
    one = found(fit(as_bench(clean), "reed"))
    for key in ("shear_modulus_kPa", "braid_angle_deg", "end_factor", "friction_fraction", "settle_ms"):
        assert one[key].value == pytest.approx(synthetic.TRUE[key], rel=2e-3), key


def test_intervals_are_no_wider_than_three_times_what_repeats_spread(twelve):
    values = np.array([[one.value for one in fitted.found] for fitted in twelve])
    half = np.array([[(one.high - one.low) / 2.0 for one in fitted.found] for fitted in twelve])
    # An honest interval at once over five parameters is 2.6 spreads to either side; twelve repeats know a spread to a quarter.
    assert np.all(half.mean(axis=0) < 3.0 * 2.6 * values.std(axis=0, ddof=1))


def test_angle_and_end_factor_are_said_to_be_hardly_told_apart(clean, as_bench):
    fitted = fit(as_bench(synthetic.noisy(clean, 1)), "reed")
    assert [set(pair[:2]) for pair in fitted.beside] == [{"braid_angle_deg", "end_factor"}]


def test_a_measured_angle_is_taken_as_given_and_sharpens_the_end_factor(clean, as_bench):
    rows = synthetic.noisy(clean, 1)
    loose = found(fit(as_bench(rows), "reed"))["end_factor"]
    fitted = fit(as_bench(rows, synthetic.HEAD + "# braid_angle_deg = 23\n"), "reed")
    sharp = found(fitted)["end_factor"]
    assert fitted.values["braid_angle_deg"] == 23.0 and "braid_angle_deg" not in found(fitted)
    assert sharp.high - sharp.low < 0.5 * (loose.high - loose.low)
    assert holds(fitted, synthetic.TRUE)


def test_slow_data_cannot_tell_the_lag_and_tell_the_others(as_bench):
    rows = synthetic.exact(program=lambda t: np.interp(t, [0, 20, 40, 60], [0, 400, 0, 0]), until=60, rate=10, fine=40)
    one = found(fit(as_bench(synthetic.noisy(rows, 1)), "reed"))
    assert [key for key, each in one.items() if not each.told] == ["settle_ms"]
    assert one["settle_ms"].low <= 15.0 <= one["settle_ms"].high


def test_filling_alone_cannot_tell_friction(as_bench):
    rows = synthetic.exact(program=lambda t: np.interp(t, [0, 20], [0, 400]), until=20, rate=50)
    fitted = fit(as_bench(synthetic.noisy(rows, 1)), "reed")
    assert not found(fitted)["friction_fraction"].told
    assert holds(fitted, synthetic.TRUE)


def test_low_pressure_cannot_tell_the_end_factor(as_bench):
    rows = synthetic.exact(program=lambda t: np.interp(t, [0, 5, 10, 15, 20], [0, 60, 0, 80, 0]), until=20, rate=50)
    fitted = fit(as_bench(synthetic.noisy(rows, 1)), "reed")
    assert not found(fitted)["end_factor"].told
    assert holds(fitted, synthetic.TRUE)


def test_a_fiber_without_friction_and_lag_is_found_to_have_none(as_bench):
    rows = synthetic.exact(true={**synthetic.TRUE, "friction_fraction": 0.0, "settle_ms": 0.0})
    one = found(fit(as_bench(synthetic.noisy(rows, 1)), "reed"))
    assert one["friction_fraction"].value < 0.001 and one["settle_ms"].value < 0.5


def test_one_row_in_thirty_far_off_moves_nothing_beyond_its_interval(clean, as_bench):
    time, pressure, strain = synthetic.noisy(clean, 3)
    rng = np.random.default_rng(3)
    strain = strain + np.where(rng.random(len(time)) < 0.03, rng.normal(0.0, 0.05, len(time)), 0.0)
    assert holds(fit(as_bench((time, pressure, strain)), "reed"), synthetic.TRUE)


def test_a_sleeve_that_was_pulled_straight_is_found(as_bench):
    rows = synthetic.noisy(synthetic.exact(true=SLEEVE, load=0.5), 1, strain_noise=0.004)
    fitted = fit(as_bench(rows, SLEEVE_HEAD), "bellow")
    assert holds(fitted, SLEEVE) and all(one.told for one in fitted.found)


def test_a_sleeve_that_was_not_is_said_to_be_untold_and_held_at_the_largest_strain(as_bench):
    rows = synthetic.exact(
        true={**SLEEVE, "sleeve_limit": 5.0}, load=0.5, program=lambda t: 0.5 * synthetic.pressure_program(t)
    )
    fitted = fit(as_bench(synthetic.noisy(rows, 1, strain_noise=0.004), SLEEVE_HEAD), "bellow")
    sleeve = found(fitted)["sleeve_limit"]
    assert sleeve.held and not sleeve.told
    assert fitted.values["sleeve_limit"] == pytest.approx(rows[2].max(), abs=0.03)
    assert found(fitted)["shear_modulus_kPa"].value == pytest.approx(100.0, rel=0.01)


def test_a_spring_for_a_load_measured_row_by_row_gives_the_true_values():
    true = {**synthetic.TRUE, "settle_ms": 0.0}
    time = np.arange(2300) / 100.0
    pressure = synthetic.pressure_program(time)
    grid = np.linspace(0.0, synthetic.stop_of(true) * (1.0 - 1e-6), 4000)
    needs = synthetic.needed_kPa(grid, true, 200.0 * grid)
    strain, now = [], 0.0
    for low, high in zip(np.interp(pressure * 0.96, needs, grid), np.interp(pressure * 1.04, needs, grid), strict=True):
        now = min(max(now, low), high)
        strain.append(now)
    rng = np.random.default_rng(4)
    rows = zip(
        200.0 * np.array(strain) + rng.normal(0.0, 0.3, 2300),
        time,
        pressure + rng.normal(0.0, 0.6, 2300),
        np.array(strain) + rng.normal(0.0, 8e-4, 2300),
        strict=True,
    )
    head = "".join(line + "\n" for line in synthetic.HEAD.splitlines() if "load" not in line)
    text = head + "force_N,time_s,pressure_kPa,strain\n" + "".join(f"{f:.3f},{t:.2f},{p:.2f},{e:.5f}\n" for f, t, p, e in rows)
    fitted = fit(read_bench(text, "spring.csv"), "reed")
    assert fitted.load_N is None and holds(fitted, true)


def read_fine(rows):
    """A bench whose rows lie closer than the demo's three decimals tell."""
    lines = "".join(f"{t:.4f},{p:.2f},{e:.5f}\n" for t, p, e in zip(*rows, strict=True))
    return read_bench(synthetic.HEAD + "time_s,pressure_kPa,strain\n" + lines, "fine.csv")


def test_a_long_bench_thinned_keeps_its_word():
    rows = synthetic.noisy(synthetic.exact(rate=2000, fine=4), 1)
    fitted = fit(read_fine(rows), "reed")
    assert fitted.rows > fitted.used and holds(fitted, synthetic.TRUE)


def test_a_wrong_load_is_noticed(as_bench):
    fitted = fit(as_bench(synthetic.noisy(synthetic.exact(load=40.0), 1)), "reed")
    assert any("load or dimensions" in note or "does not explain" in note for note in fitted.notes)


def test_the_right_load_is_not_complained_of(clean, as_bench):
    fitted = fit(as_bench(synthetic.noisy(clean, 1)), "reed")
    assert not any("misses" in note for note in fitted.notes)


def test_numbers_without_sense_end_in_a_warning_and_finite_numbers(as_bench):
    rng = np.random.default_rng(1)
    time = np.arange(800) / 100.0
    fitted = fit(as_bench((time, np.abs(rng.normal(100, 80, 800)), rng.random(800) * 0.3)), "reed")
    assert any("does not explain" in note for note in fitted.notes)
    assert all(np.isfinite([one.value, one.low, one.high]).all() for one in fitted.found)


def test_everything_given_leaves_nothing_to_find(clean, as_bench):
    given = "".join(f"# {key} = {value}\n" for key, value in synthetic.TRUE.items() if "_mm" not in key)
    fitted = fit(as_bench(synthetic.noisy(clean, 1), synthetic.HEAD + given), "reed")
    assert fitted.found == () and fitted.noise == pytest.approx(synthetic.STRAIN_NOISE, rel=0.1)


def test_a_contractile_strain_above_all_braids_is_refused(clean, as_bench):
    time, pressure, strain = clean
    with pytest.raises(Faults, match="every braid stops"):
        fit(as_bench((time, pressure, strain * 2.0)), "reed")
