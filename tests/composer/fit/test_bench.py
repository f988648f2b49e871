"""Benches as things: thinning."""

import numpy as np

from composer.fit.bench import thinned

from . import synthetic


def test_a_bench_that_is_short_enough_stays_as_it_is(clean, as_bench):
    bench = as_bench(clean)
    assert thinned(bench, bench.rows) is bench


def test_a_long_bench_becomes_means_of_equal_numbers_of_rows(clean, as_bench):
    bench = as_bench(clean)
    short = thinned(bench, 1000)
    assert short.rows == bench.rows // 5
    for name in ("time", "pressure", "strain"):
        np.testing.assert_allclose(getattr(short, name)[3], getattr(bench, name)[15:20].mean())
    assert short.line[3] == bench.line[15]


def test_thinning_halves_the_noise_of_four_rows(as_bench):
    time = np.arange(20_000) / 100.0
    rng = np.random.default_rng(1)
    bench = as_bench((time, 200.0 + 50.0 * np.sin(time), 0.2 + 0.01 * rng.standard_normal(len(time))), "")
    assert abs(np.std(thinned(bench, 5000).strain) - 0.005) < 0.0003


def test_the_demo_bench_is_what_its_script_writes():
    from importlib.resources import files

    stands = (files("scores_demo") / "reed-bench.csv").read_text(encoding="utf-8")
    made = synthetic.demo()
    assert stands.split("time_s")[0] == made.split("time_s")[0]
    rows = [np.array([line.split(",") for line in text.splitlines() if line[0].isdigit()], float) for text in (stands, made)]
    np.testing.assert_allclose(rows[0], rows[1], atol=0.011)


def test_the_demo_bench_says_that_it_is_invented():
    assert "Invented" in synthetic.demo().splitlines()[0]
