import numpy as np
import pytest

from composer.faults import Faults
from composer.score.reading import read_score
from composer.score.tempo import tempo_map
from player.inputs.file_to_score import RAMP_S, score_of
from player.inputs.midi_file import Times


def lines(times):
    return score_of(times, "songs/a.mid").splitlines()


def times(tempi=(), meters=(), markers=(), division=480):
    return Times(division, tuple(meters), tuple(tempi), tuple(markers))


def steps(first, last, counts, each, from_tick=0, left=False, division=480):
    """Tempo steps of a ramp, each at the tempo of its middle (or of its beginning)."""
    number = round(counts / each)
    at = (np.arange(number) + (0.0 if left else 0.5)) / number
    rows = [(from_tick + round(k * each * division), round(60e6 / (first + (last - first) * at[k]))) for k in range(number)]
    return [*rows, (from_tick + round(counts * division), round(60e6 / last))]


def seconds_of_file(found, tick):
    """By hand: every stretch at its own tempo."""
    total = 0.0
    rows = [(0, 500_000), *found.tempi]
    for (begin, micros), (end, _) in zip(rows, [*rows[1:], (tick, 0)], strict=True):
        total += max(0, min(end, tick) - begin) * micros * 1e-6 / found.division
    return total


def test_a_plain_file_says_meter_and_tempo():
    assert lines(times([(0, 833_333)])) == ["# from a.mid", "meter   4/4", "tempo   72"]


def test_a_file_that_says_nothing_is_at_120_in_4():
    assert lines(times())[1:] == ["meter   4/4", "tempo   120"]


def test_tempi_are_in_the_meter_s_own_counts():
    found = times([(0, 500_000)], [(0, 6, 8), (480 * 3, 2, 2)])
    assert lines(found)[1:] == ["meter   6/8", "meter   2/2 at 2:1", "tempo   240", "tempo   60 at 2:1"]


def test_an_odd_tempo_keeps_its_microseconds():
    tempo = lines(times([(0, 654_321)]))[-1].split()[1]
    assert round(60e6 / float(tempo)) == 654_321


def test_markers_are_cues_with_names_of_their_own():
    rows = [(0, 'say "a"'), (480, "x\ny"), (960, "solo (wait)"), (1920, "solo"), (2400, "solo"), (2880, "  ")]
    assert lines(times(markers=rows))[3:] == [
        "cue     \"say 'a'\" at 1:1",
        'cue     "x y" at 1:2',
        'cue     "solo" at 1:3 wait',
        'cue     "solo 2" at 2:1',
        'cue     "solo 3" at 2:2',
        'cue     "marker 6" at 2:3',
    ]


@pytest.mark.parametrize(("first", "last"), [(60, 90), (96, 60), (72, 80), (120, 40)])
def test_steps_of_tempo_become_one_ramp_between_round_numbers(first, last):
    found = times([(0, round(60e6 / first)), *steps(first, last, 16, 1 / 8, from_tick=480 * 8)], [(0, 4, 4)])
    tempi = [line for line in lines(found) if line.startswith("tempo")]
    assert tempi == [f"tempo   {first}", f"tempo   {first} to {last} from 3:1 to 7:1"]


@pytest.mark.parametrize("left", [False, True])
def test_a_ramp_takes_the_time_that_its_steps_take(left):
    found = times([*steps(60, 100, 12, 1 / 16, left=left), (480 * 20, 600_000)])
    score = read_score(score_of(found, "a.mid"), "s")
    tempo = tempo_map(score)
    for count in (3, 6, 12, 16, 20, 24):
        assert float(tempo.seconds(count)) == pytest.approx(seconds_of_file(found, count * 480), abs=2 * RAMP_S)
    assert any(line.startswith("tempo") and " to " in line for line in score_of(found, "a.mid").splitlines())


def test_steps_that_make_no_ramp_stay_steps():
    rows = [(480 * k, micros) for k, micros in enumerate((500_000, 600_000, 450_000, 700_000, 480_000, 650_000))]
    assert sum(" to " in line for line in lines(times(rows))) == 0


def test_a_tempo_that_no_score_has_is_told_with_its_place():
    with pytest.raises(Faults, match=r"a tempo of 6e\+07 counts a minute at 2:1"):
        score_of(times([(480 * 4, 1)]), "a.mid")


def test_thousands_of_steps_that_almost_make_a_ramp_take_no_square_of_time():
    rates = 100 + np.cumsum(0.001 * (1 + 0.1 * np.sin(np.arange(20_000))))
    found = times([(60 * k, round(60e6 / rate)) for k, rate in enumerate(rates)])
    assert len(lines(found)) > 2


def test_what_is_written_is_a_score_that_can_be_read():
    found = times(steps(60, 90, 8, 1 / 8), [(0, 3, 4), (480 * 9, 5, 8)], [(7, "a"), (481, "b (wait)"), (5000, 'c"d')])
    score = read_score(score_of(found, "a.mid"), "s")
    assert [cue.name for cue in score.cues] == ["a", "b", "c'd"]
    assert [cue.wait for cue in score.cues] == [False, True, False]
