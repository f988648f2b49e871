"""Numbers for instants and strains."""

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.edits.values import counts_from_place, form_of, nearest, per_strain, place_of, target_on_steps
from composer.limits.abilities import abilities_of
from composer.score.model import Place, Span
from composer.score.reading import read_score
from composer.score.spans import Handle
from composer.score.tempo import tempo_map

TEMPO = tempo_map(read_score("meter 4/4\nmeter 3/4 at 5:1\nmeter 5/4 at 9:1\ntempo 90\n", "s"))


@given(st.integers(0, 4000))
def test_a_place_of_counts_is_the_place_with_those_counts(eighths):
    counts = Fraction(eighths, 8)
    bar, count = place_of(counts, TEMPO)
    assert TEMPO.counts_of(Place(bar, count, None, Span("s", 1, 1, 2))) == pytest.approx(float(counts))
    assert counts_from_place(Handle("at", Span("s", 1, 1, 2), count, "place", bar), TEMPO) == counts


@given(st.floats(0, 1000), st.sampled_from([Fraction(1, 3), Fraction(1, 4), Fraction(1), Fraction(1, 96)]))
def test_the_nearest_multiple_is_no_farther_than_half_a_step(value, step):
    found = nearest(value, step)
    assert (found / step).denominator == 1
    assert abs(float(found) - value) <= float(step) / 2 + 1e-9


def test_forms_are_told_and_a_word_is_one():
    assert [form_of(text) for text in ("3", "0.5", "3/4", "2+1/2", "12%", "full", "hold")] == [
        "whole", "decimal", "fraction", "mixed", "whole", "word", "word",
    ]  # fmt: skip


def test_targets_keep_to_the_steps_of_their_unit():
    assert target_on_steps("stroke", "0.5", 0.6789, False) == Fraction(68, 100)
    assert target_on_steps("stroke", "0.5", 0.6789, True) == Fraction(679, 1000)
    assert target_on_steps("stroke", "1/3", 0.5, False) == Fraction(1, 2)
    assert target_on_steps("mm", "20mm", 31.4, False) == 31


def test_a_unit_of_strain_is_its_own_for_each_fiber(make_rig):
    abilities = abilities_of(make_rig(1, stroke=0.25))
    assert per_strain("stroke", 0, abilities) == 4.0
    assert per_strain("%", 0, abilities) == 100.0
    assert per_strain("mm", 0, abilities) == abilities.length_mm[0]
