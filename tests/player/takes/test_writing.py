"""What a take looks like as text, and that the text is the take."""

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.limits.abilities import abilities_of
from composer.load import made_from
from composer.motion import strain_at
from composer.rig.select import Selector
from composer.score.reading import read_score
from player.takes.places import UNIT
from player.takes.writing import fibers_text, number_text, place_text, score_text, write

from .hands import governed, hand


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (Fraction(3), "3"),
        (Fraction(3, 4), "0.75"),
        (Fraction(13, 4), "3.25"),
        (Fraction(1, 8), "1/8"),
        (Fraction(49, 16), "3.0625"),
        (Fraction(1, 16), "1/16"),
        (Fraction(52, 100), "0.52"),
        (Fraction(1, 3), "1/3"),
    ],
)
def test_numbers_are_written_in_their_shortest_form(value, text):
    assert number_text(value) == text


def test_places_are_written_in_bars_and_counts(even_tempo):
    assert [place_text(at, even_tempo()) for at in (0, UNIT, 4 * UNIT, 21 * UNIT // 4)] == ["1:1", "1:2", "2:1", "2:2.25"]


def test_fibers_are_named_by_group_or_range_where_that_says_the_same(make_rig):
    rig = make_rig(6)
    selector = Selector(rig, {})

    def said(*fibers):
        return fibers_text(np.array(fibers), rig, selector)

    assert said(0, 1, 2, 3, 4, 5) == "all"
    assert said(0, 1, 2, 5) == "r.1-3, r.6"
    assert said(4) == "r.5"


PAGE = """# played

title   "Tried"
rig     bench.rig.toml
meter   4/4
tempo   60

phrase take.all.1
  2  0.5
  5  0.8 over 2

phrase take.all.2 8
  4  rest

section take at 1:1
  all  take.all.1  at 1:3
  all  take.all.2  at 5:2
"""


def text_of(rig, settled, tempo, counts):
    written = write(settled.voices, settled.paths, rig, Selector(rig, {}), tempo, "take", punch=False)
    return score_text(written, "Tried", "bench.rig.toml", ["meter   4/4", f"tempo   {counts:g}"], ["played"])


def test_a_hold_and_the_move_after_it_are_one_line_and_what_follows_a_rest_is_another_phrase(make_rig, fitted, even_tempo):
    def smooth(u):
        return 10 * u**3 - 15 * u**4 + 6 * u**5

    times = np.arange(5001) * 0.005
    value = 0.5 * smooth(np.clip((times - 2.0) / 2.0, 0.0, 1.0))
    value += 0.3 * smooth(np.clip((times - 5.0) / 2.0, 0.0, 1.0)) - 0.8 * smooth(np.clip((times - 17.0) / 4.0, 0.0, 1.0))
    rig = make_rig(2, fill=3.0, exhaust=3.0)
    text = text_of(rig, fitted(rig, [value, value]), even_tempo(), 60.0)
    assert text == PAGE


@settings(max_examples=20, deadline=None)
@given(
    seeds=st.lists(st.integers(0, 10_000), min_size=1, max_size=3),
    fill=st.floats(0.1, 3.0),
    counts=st.sampled_from([30.0, 72.0, 140.0]),
    tolerance=st.sampled_from([0.01, 0.03]),
)
def test_the_text_opens_and_expands_to_the_very_tracks_that_were_fitted(
    make_rig, fitted, even_tempo, seeds, fill, counts, tolerance
):
    rig = make_rig(len(seeds), fill=fill)
    abilities = abilities_of(rig)
    times, let = governed(rig, abilities, np.array([hand(8.0, seed) for seed in seeds]))
    settled = fitted(rig, let / abilities.stroke[:, None], tolerance=tolerance, counts=counts)
    loaded = made_from(read_score(text_of(rig, settled, even_tempo(counts), counts), "tried.score"), rig)
    there = strain_at(loaded.tracks, abilities, times)
    assert there == pytest.approx(strain_at(settled.tracks, abilities, times), abs=1e-9)
    assert np.abs(there - let).max() <= tolerance * 0.3
    assert loaded.tracks.duration_s >= times[-1] - 1e-9 or not settled.voices
