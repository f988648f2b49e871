"""The law: for every input, on every limit and all of them, what was governed has no snag, and comes to rest."""

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

LAW = settings(max_examples=80, deadline=None, suppress_health_check=list(HealthCheck))

ENDS = [0.0, 1.0, 0.45, 0.5, 0.5000001, -1.0, 2.0, np.inf, -np.inf, np.nan]


@st.composite
def tables(draw):
    """Rates and air that change with strain as they like, at points that lie evenly or not."""
    points = draw(st.integers(3, 24))
    steps = np.ones(points - 1)
    if draw(st.booleans()):
        steps = np.array(draw(st.lists(st.floats(0.05, 1.0), min_size=points - 1, max_size=points - 1)))
    strain = np.concatenate([[0.0], np.cumsum(steps)])
    strain *= 0.3 / strain[-1]
    strain[-1] = 0.3

    def column(least, most):
        return np.array(draw(st.lists(st.floats(least, most), min_size=points, max_size=points)))

    scale = draw(st.sampled_from([0.1, 1.0, 10.0]))
    air = np.concatenate([[0.0], np.cumsum(column(0.0, 1.0)[1:])]) * 0.003
    return strain, column(0.1, 1.0) * scale, column(0.05, 1.0) * scale, air


@st.composite
def rigs(draw):
    """Everything that `run_of` takes."""
    pick = lambda *values: draw(st.sampled_from(values))  # noqa: E731
    return {
        "count": pick(1, 2, 5),
        "fill": pick(0.05, 0.6, 5.0, 50.0),
        "exhaust": pick(0.02, 0.3, 4.0, 50.0),
        "accel": pick(None, None, 0.5, 20.0, 1e4, 1e6),
        "max_hold_s": pick(0.0, 0.01, 0.1, 0.5, 2.0),
        "duty": pick(1.0, 0.05, 0.5, 0.95),
        "duty_burst_s": pick(0.0, 0.05, 0.3, 1.0, 3.0),
        "energised_while_holding": draw(st.booleans()),
        "max_switch_Hz": pick(0.7, 5.0, 50.0, 333.0, 1e4),
        "receiver_L": pick(1e-4, 0.003, 0.01, 10.0),
        "compressor_L_min": pick(0.0, 0.05, 1.0, 40.0),
        "longest_tick_s": pick(0.01, 0.02),
        "table": draw(st.none() | tables()),
    }


@st.composite
def stretches(draw):
    """Shares of stroke wanted of one fiber for some ticks."""
    count = draw(st.sampled_from([1, 2, 5, 20, 80]))
    kind = draw(st.sampled_from(["level", "end", "noise", "steps", "ramp", "bits", "spikes"]))
    random = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    a, b = draw(st.floats(0.0, 1.0)), draw(st.floats(0.0, 1.0))
    k = np.arange(count)
    return {
        "level": lambda: np.full(count, a),
        "end": lambda: np.full(count, draw(st.sampled_from(ENDS))),
        "noise": lambda: random.uniform(-0.2, 1.2, count),
        "steps": lambda: np.where(k // draw(st.integers(1, 9)) % 2 == 0, a, b),
        "ramp": lambda: np.linspace(a, b, count),
        "bits": lambda: a + random.integers(-2, 3, count) / 65535.0,
        "spikes": lambda: np.where(random.random(count) < 0.2, random.uniform(0.0, 1.0, count), 0.0),
    }[kind]()


inputs = st.lists(st.lists(stretches(), min_size=1, max_size=5), min_size=5, max_size=5)
ticks = st.one_of(
    st.sampled_from([0.0005, 0.001, 0.002, 0.005, 0.01]).map(lambda dt: [dt]),
    st.lists(st.floats(0.0003, 0.01), min_size=2, max_size=7),
)


@pytest.mark.timeout(600)
@LAW
@given(options=rigs(), wanted=inputs, dts=ticks, silent=st.lists(st.booleans(), min_size=5, max_size=5), still=st.booleans())
def test_whatever_is_wanted_what_is_sent_has_no_snag_and_comes_to_rest(run_of, options, wanted, dts, silent, still):
    run = run_of(**options)
    count, stroke = run.governor.fibers, run.governor.stroke
    each = [np.concatenate(w) for w in wanted[:count]]
    longest = max(len(w) for w in each)
    wanted = np.array([np.pad(w, (0, longest - len(w)), mode="edge") for w in each]).T * stroke
    silent = np.array(silent[:count])
    for number, row in enumerate(wanted):
        run.tick(row, dts[number % len(dts)], silent if still and number % 100 > 60 else None)
    stopped, number = run.time_s[-1], 0
    while run.state.strain.any() or run.state.rate.any():
        run.tick(np.zeros(count), dts[number % len(dts)], np.full(count, True) if still else None)
        number += 1
        assert run.time_s[-1] - stopped < rest_within_s(run)
    assert run.check().snags == ()


def rest_within_s(run) -> float:
    """The safe way at two thirds of the slowest way back, the coil's least time on, and the brakes."""
    governor = run.governor
    whole = governor.live.columns[3].max() + governor.spare_s.max()
    brakes = 2.0 * np.sqrt(0.3 / governor.accel.min()) + 2.0 * 50.0 / governor.accel.min()
    return 1.6 * whole + 2.0 * governor.min_on_s.max() + brakes


@pytest.mark.timeout(600)
@settings(max_examples=15, deadline=None, suppress_health_check=list(HealthCheck))
@given(st.integers(0, 2**32 - 1), st.sampled_from([None, 20.0]))
def test_many_fibers_on_one_small_receiver_have_no_snag(run_of, seed, accel):
    random = np.random.default_rng(seed)
    run = run_of(
        40, accel=accel, receiver_L=0.02, compressor_L_min=2.0, max_hold_s=0.8, duty=0.7, duty_burst_s=1.5, max_switch_Hz=40.0
    )
    for _ in range(25):
        run.wait(random.uniform(0.005, 0.2), random.uniform(-0.1, 1.1, 40) * 0.3)
    run.wait(2.0, 0.0)
    assert run.check().snags == ()
    assert not run.state.strain.any()
