import math
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from composer.score.model import Meter, Place, Span, Tempo
from composer.score.reading import parse_score
from composer.score.tempo import TempoMap, tempo_map


def mapped(text: str) -> TempoMap:
    return tempo_map(parse_score(text, "t.score")[0])


def place(bar: int, count: str = "1", seconds: str | None = None) -> Place:
    return Place(bar, Fraction(count), None if seconds is None else Fraction(seconds), Span("t.score", 1, 1, 2))


def test_a_ramp_from_60_to_120_over_8_counts_lasts_8_ln_2_seconds(outside):
    lasts = float(mapped("tempo 60 to 120 from 1:1 to 3:1").seconds(8))
    assert lasts == pytest.approx(outside["tempo_ramp"]["seconds_60_to_120_over_8_counts"], rel=1e-15)
    assert lasts == pytest.approx(8 * math.log(2), rel=1e-15)


def test_a_ramp_holds_its_last_tempo():
    tempo = mapped("tempo 60 to 120 from 1:1 to 3:1")
    assert float(tempo.seconds(12) - tempo.seconds(8)) == pytest.approx(2.0, rel=1e-14)


def test_a_score_without_tempo_or_meter_is_60_in_four():
    tempo = mapped("")
    assert float(tempo.seconds(10)) == 10.0
    assert float(tempo.bars(10)) == 2.5


def test_tempi_apply_in_order_of_place_however_they_are_written():
    one, other = mapped("tempo 90 at 3:1\ntempo 120 at 5:1\ntempo 60"), mapped("tempo 60\ntempo 120 at 5:1\ntempo 90 at 3:1")
    assert np.array_equal(one.tempo_s, other.tempo_s) and np.array_equal(one.rate, other.rate)
    assert float(one.seconds(20)) == pytest.approx(8 + 8 / 1.5 + 4 / 2)


def test_a_change_at_a_place_in_seconds_falls_among_those_at_bars():
    tempo = mapped("tempo 60\ntempo 120 at 10s\ntempo 30 at 5:1")
    assert float(tempo.seconds(16)) == pytest.approx(10 + 6 / 2)
    assert float(tempo.seconds(17)) == pytest.approx(13 + 2)


def test_a_ramp_that_ends_at_a_place_in_seconds_ends_there():
    tempo = mapped("tempo 60 to 90 from 2s to 10s")
    assert float(tempo.seconds(tempo.tempo_count[-1])) == pytest.approx(10.0, rel=1e-14)
    assert float(tempo.counts(11.0) - tempo.counts(10.0)) == pytest.approx(1.5, rel=1e-13)


def test_bars_follow_the_changes_of_meter():
    tempo = mapped("meter 4/4\nmeter 3/4 at 3:1")
    assert float(tempo.counts_of(place(4, "2"))) == 8 + 3 + 1
    assert float(tempo.bars(9.5)) == 2.5
    assert float(tempo.shifted(6.0, 1.0, "bars")) == pytest.approx(8 + 1.5)


def test_a_count_that_its_bar_does_not_have_is_a_fault():
    tempo = mapped("meter 3/4")
    assert tempo.counts_of(place(2, "15/4")) == 3 + 2.75
    with pytest.raises(Faults, match="bar 2 has no count 4"):
        tempo.counts_of(place(2, "4"))


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("tempo 90 at 3:1\ntempo 80 at 3:1", "line 1"),
        ("tempo 60 to 90 from 2:1 to 4:1\ntempo 80 at 3:1", "line 1"),
        ("tempo 60 to 90 from 20s to 10s", "ends before it starts"),
        ("tempo 60 to 90 from 9:1 to 5s", "ends before it starts"),
        ("meter 3/4 at 2:1\nmeter 4/4 at 2:1", "two meters"),
    ],
)
def test_changes_that_contradict_one_another_are_faults(text, says):
    with pytest.raises(Faults, match=says):
        mapped(text)


def test_a_tempo_that_no_one_can_count_is_a_fault():
    tempo = Tempo(Fraction(1001), None, None, None, Span("t.score", 1, 1, 2))
    with pytest.raises(Faults, match="1001 counts a minute; expected counts a minute, 1 to 1000"):
        tempo_map(replace(parse_score("", "t.score")[0], tempi=(tempo,)))


def test_a_meter_that_changes_inside_a_bar_is_a_fault():
    meter = Meter(3, 4, place(2, "2"), Span("t.score", 1, 1, 2))
    with pytest.raises(Faults, match="inside a bar"):
        tempo_map(replace(parse_score("", "t.score")[0], meters=(meter,)))


def test_places_are_said_as_they_are_written():
    tempo = mapped("meter 4/4\nmeter 3/4 at 3:1\ntempo 72")
    for bar, count, said in ((1, "1", "1:1"), (2, "7/2", "2:3.5"), (3, "1", "3:1"), (5, "5/2", "5:2.5")):
        assert tempo.say_place(float(tempo.seconds(tempo.counts_of(place(bar, count))))) == said


def test_a_hair_before_a_bar_is_said_as_that_bar():
    assert mapped("").say_place(4 - 1e-9) == "2:1"


STRETCHES = st.lists(
    st.tuples(st.integers(1, 5), st.integers(1, 1000), st.integers(1, 1000), st.booleans(), st.booleans()),
    min_size=1,
    max_size=6,
)


@given(STRETCHES, st.lists(st.floats(0, 500), min_size=1, max_size=20))
def test_counts_and_seconds_are_inverse_and_rise_together(stretches, counts):
    rows, bar = [], 1
    for bars, rate, to, ramp, nearly in stretches:
        to = Fraction(rate) + Fraction(1, 10**9) if nearly and rate < 1000 else to
        shown = f"{float(to):.9f}"
        rows.append(f"tempo {rate} to {shown} from {bar}:1 to {bar + bars}:1" if ramp else f"tempo {rate} at {bar}:1")
        bar += bars
    tempo = mapped("\n".join(rows))
    counts = np.sort(np.array(counts))
    seconds = tempo.seconds(counts)
    assert np.all(np.diff(seconds) >= 0)
    np.testing.assert_allclose(tempo.counts(seconds), counts, rtol=1e-12, atol=1e-12)


@given(st.lists(st.tuples(st.integers(1, 9), st.integers(1, 12)), max_size=6), st.lists(st.floats(0, 500), min_size=1))
def test_bars_and_counts_are_inverse(meters, counts):
    rows, bar = [], 1
    for bars, size in meters:
        rows.append(f"meter {size}/4 at {bar}:1")
        bar += bars
    tempo = mapped("\n".join(rows))
    np.testing.assert_allclose(tempo.counts_of_bars(tempo.bars(counts)), counts, rtol=1e-13, atol=1e-12)
