"""Fits of rated fibers: stroke and rates of moves whose rates are known."""

import numpy as np
import pytest

from composer.faults import Faults
from composer.fit.fitting import fit
from composer.fit.reading import read_bench

HEAD = '# kind = "rated"\n# direction = "extend"\n# rest_length_mm = 300\n# air_mL = 5\n'


def bench(fill=0.6, exhaust=0.3, noise=0.001, seed=0, head=HEAD, goal=lambda t: 0.3 * (t % 4.0 > 1.0) * (t % 4.0 < 2.4)):
    rng = np.random.default_rng(seed)
    time, now, rows = np.arange(2400) / 100.0, 0.0, []
    for t in time:
        now = min(max(goal(t), now - exhaust / 100.0), now + fill / 100.0)
        rows.append(f"{t:.2f},{350.0 * (goal(t) > 0) + rng.normal(0, 0.5):.2f},{now + rng.normal(0, noise):.5f}\n")
    return read_bench(head + "time_s,pressure_kPa,strain\n" + "".join(rows), "rated.csv")


def found(fitted):
    return {one.key: one for one in fitted.found}


@pytest.mark.parametrize("fill, exhaust", [(0.6, 0.3), (1.5, 0.4), (0.35, 0.9)])
def test_stroke_and_rates_are_those_that_the_fiber_moved_with(fill, exhaust):
    fitted = fit(bench(fill, exhaust), "drop")
    one = found(fitted)
    assert one["stroke"].value == pytest.approx(0.3, rel=0.01)
    assert one["fill_rate_per_s"].value == pytest.approx(fill, rel=0.03)
    assert one["exhaust_rate_per_s"].value == pytest.approx(exhaust, rel=0.03)
    assert all(each.told for each in fitted.found)
    assert fitted.values["direction"] == "extend" and fitted.values["air_mL"] == 5.0


def test_slow_moves_do_not_lower_the_rate():
    def goal(t):
        return 0.3 * (1.0 < t < 3.0) + (min(0.05 * (t - 5.0), 0.3) if 5.0 < t < 13.0 else 0.0) + 0.3 * (15.0 < t < 17.0)

    assert found(fit(bench(goal=goal), "drop"))["fill_rate_per_s"].value == pytest.approx(0.6, rel=0.03)


def test_a_value_in_the_head_is_taken_as_given():
    fitted = fit(bench(head=HEAD + "# stroke = 0.25\n"), "drop")
    assert fitted.values["stroke"] == 0.25 and "stroke" not in found(fitted)


def test_a_fiber_that_never_makes_a_whole_move_is_refused():
    with pytest.raises(Faults, match="never empties"):
        fit(bench(goal=lambda t: min(0.01 * t, 0.3)), "drop")
