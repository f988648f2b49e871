import io
from importlib.resources import files

import mido
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from composer.score.reading import read_score
from composer.score.tempo import tempo_map
from player.inputs.file_to_score import score_of
from player.inputs.midi_file import DIVISION, write_midi
from player.inputs.score_to_file import times_of


def times(text):
    score = read_score(text, "s")
    return times_of(score, tempo_map(score))


def seconds_by_mido(found, tick):
    """The time of a tick as mido counts it."""
    at, total, micros = 0, 0.0, 500_000
    for message in mido.MidiFile(file=io.BytesIO(write_midi(found))).tracks[0]:
        step = min(message.time, tick - at)
        total += mido.tick2second(step, DIVISION, micros)
        at += step
        if message.type == "set_tempo" and at < tick:
            micros = message.tempo
    return total + mido.tick2second(tick - at, DIVISION, micros)


def test_counts_are_the_meter_s_note_values():
    found = times("meter 6/8\ntempo 240\nmeter 2/2 at 2:1\n")
    assert found.meters == ((0, 6, 8), (3 * DIVISION, 2, 2))
    assert found.tempi == ((0, 500_000), (3 * DIVISION, 125_000))


def test_cues_are_markers_and_those_that_wait_say_so():
    assert times('cue "b" at 2:1 wait\ncue "a" at 1:2.5\n').markers == ((1440, "a"), (3840, "b (wait)"))


@pytest.mark.parametrize(
    "text", ["tempo 60 to 120 from 1:1 to 5:1\n", "tempo 90\ntempo 90 to 45 from 2:1 to 3:1\ntempo 77.7 at 4:2\n"]
)
def test_the_file_is_where_the_score_is_to_a_millisecond(text):
    tempo, found = tempo_map(read_score(text, "s")), times(text)
    for count in np.linspace(0, 40, 161):
        assert seconds_by_mido(found, round(count * DIVISION)) == pytest.approx(float(tempo.seconds(count)), abs=1e-3)


@pytest.mark.parametrize("name", ["estuary", "gannet"])
def test_the_demo_scores_come_back_with_the_same_meters_ramps_cues_and_times(name):
    text = (files("scores_demo") / f"{name}.score").read_text(encoding="utf-8")
    score, again = read_score(text, "s"), read_score(score_of(times(text), f"{name}.mid"), "s")
    assert [(meter.counts, meter.note) for meter in again.meters] == [(meter.counts, meter.note) for meter in score.meters]
    for kind in ("cues", "tempi"):
        assert _placed(again, kind) == _placed(score, kind)
    counts = np.arange(300)
    assert tempo_map(again).seconds(counts) == pytest.approx(tempo_map(score).seconds(counts), abs=1e-9)


def _placed(score, kind):
    """Cues and ramps with their places; a tempo that only says again what holds already may be missing."""
    rows = [one for one in getattr(score, kind) if kind == "cues" or one.to is not None]
    return [(one.at.bar, one.at.count, *(getattr(one, key, None) for key in ("name", "wait", "rate", "to"))) for one in rows]


RATES = st.integers(20, 300)


@given(st.lists(st.tuples(RATES, RATES, st.integers(2, 12)), min_size=1, max_size=4), st.sampled_from(["4/4", "3/4", "6/8"]))
def test_ramps_come_back_as_ramps_that_take_the_same_time(ramps, meter):
    text, bar = f"meter {meter}\n", 1
    for first, last, bars in ramps:
        text += f"tempo {first} to {last} from {bar}:1 to {bar + bars}:1\n"
        bar += bars + 1
    score = read_score(text, "s")
    tempo, back = tempo_map(score), tempo_map(read_score(score_of(times(text), "f"), "s"))
    counts = tempo.counts_of_bars(np.arange(bar))
    assert back.seconds(counts) == pytest.approx(tempo.seconds(counts), abs=4e-3)


def test_a_tempo_too_slow_for_a_midi_file_is_told():
    with pytest.raises(Faults, match=r"a tempo of 3 quarter notes a minute; expected more than 3\.58"):
        times("tempo 3\n")
