"""How a score falls into pages."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.picture.bands import Band
from composer.picture.cloth import print_plan
from composer.picture.cloth.print_plan import PAGE_S, PAGE_THREADS, Named, bar_runs, names_on, parts_of, sections_of, sheets
from composer.score.reading import read_score
from composer.score.tempo import TempoMap, tempo_map


def steady(rate=1.0, counts=4.0):
    zero = np.zeros(1)
    return TempoMap(zero, zero, np.array([rate]), zero, zero, zero, np.array([counts]))


@given(rate=st.floats(0.05, 16.0), counts=st.integers(1, 12), to_s=st.floats(0.1, 2000.0))
def test_pages_begin_and_end_with_whole_bars_and_cover_the_score(rate, counts, to_s):
    runs = list(bar_runs(steady(rate, float(counts)), to_s))
    bar_s = counts / rate
    assert runs[0][0] == 0
    assert all(before[1] == after[0] for before, after in pairwise(runs))
    assert runs[-1][3] >= to_s - 1e-3
    assert runs[-1][2] < to_s
    for first, last, begins, ends in runs:
        assert last > first
        assert (begins, ends) == (pytest.approx(first * bar_s), pytest.approx(last * bar_s))
        assert ends - begins <= PAGE_S * (1 + 1e-6) or last == first + 1


@given(sizes=st.lists(st.integers(1, 250), max_size=12))
def test_pages_take_every_thread_once_in_order_and_no_more_than_fit(sizes):
    edges = np.concatenate([[0], np.cumsum(sizes)]).astype(int)
    bands = [Band(f"b{n}", a, b) for n, (a, b) in enumerate(pairwise(edges.tolist()))]
    parts = list(parts_of(bands))
    assert [f for part in parts for band in part for f in range(band.first, band.last)] == list(range(edges[-1]))
    assert all(sum(band.last - band.first for band in part) <= PAGE_THREADS for part in parts)


def test_a_band_that_fits_on_a_page_is_never_cut():
    bands = [Band("a", 0, 60), Band("b", 60, 120), Band("c", 120, 130)]
    assert [[band.name for band in part] for part in parts_of(bands)] == [["a"], ["b", "c"]]


def test_threads_of_a_stretch_come_before_the_next_stretch():
    found = list(sheets(steady(), 100.0, [Band("a", 0, 90), Band("b", 90, 150)]))
    assert [(one.from_bar, one.bands[0].name) for one in found] == [(0, "a"), (0, "b"), (15, "a"), (15, "b")]


def test_very_many_short_bars_are_cut_at_so_many_a_page(monkeypatch):
    monkeypatch.setattr(print_plan, "MOST_BARS", 10)
    assert [run[:2] for run in bar_runs(steady(100.0), 1.0)] == [(0, 10), (10, 20), (20, 25)]


def test_a_page_names_the_section_under_way_and_those_that_start_on_it():
    sections = (Named("one", 0.0), Named("two", 30.0), Named("three", 60.0), Named("two", 70.0))
    assert names_on(sections, 0.0, 60.0) == ["one", "two"]
    assert names_on(sections, 60.0, 120.0) == ["three", "two"]
    assert names_on(sections, 65.0, 66.0) == ["three"]


SCORE = """rig "bench.rig.toml"

phrase rise
  0    0
  2    0.3

section one at 1:1
  r.*  rise

section two at 3:1 times 3 every 8
  r.*  rise
"""


def test_every_repeat_of_a_section_has_its_place():
    score = read_score(SCORE, "bench.score")
    found = [(one.name, one.at_s) for one in sections_of(score, tempo_map(score))]
    assert found == [("one", 0.0), ("two", 8.0), ("two", 16.0), ("two", 24.0)]
