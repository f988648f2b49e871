from dataclasses import dataclass, replace

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings

from composer.faults import Faults
from composer.limits.abilities import abilities_of
from composer.motion import strain_at
from composer.rig.select import Selector
from composer.score.expand import expand
from composer.score.flat import write_flat
from composer.score.reading import read_score
from composer.score.tempo import tempo_map
from composer.tracks import HOLD, STEP, Tracks

from .playing import faster_when_full, played
from .random_scores import scores


@dataclass(frozen=True)
class Placed:
    name: str
    seconds: float
    wait: bool


def read_back(tracks: Tracks, text: str, rig, abilities=None, cues=()) -> tuple[str, Tracks]:
    """The flat text, and what it expands to."""
    score = read_score(text, "t.score")
    flat = write_flat(tracks, score, rig, tempo_map(score), cues)
    return flat, expand(read_score(flat, "flat.score"), rig, abilities or abilities_of(rig), Selector(rig, {}))


def close(one: Tracks, other: Tracks, abilities) -> None:
    """The same strain everywhere away from jumps, the same knots where they can be told apart."""
    assert abs(one.duration_s - other.duration_s) < 1e-6
    for fiber in range(one.fibers):
        mine, theirs = (t.time_s[t.first[fiber] : t.first[fiber + 1]] for t in (one, other))
        both = np.unique(np.concatenate([mine, theirs, [one.duration_s + 1]]))
        assert all(np.abs(mine - knot).min() < 1e-6 for knot in theirs)
        assert all(np.abs(theirs - knot).min() < 1e-6 for knot in mine)
        wide = np.flatnonzero(np.diff(both) > 1e-5)
        times = (both[wide, None] + np.diff(both)[wide, None] * np.linspace(0.001, 0.999, 9)).ravel()
        np.testing.assert_allclose(
            strain_at(one, abilities, times)[fiber], strain_at(other, abilities, times)[fiber], atol=1e-9
        )


@settings(max_examples=150, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores())
def test_a_flat_score_expands_to_the_same_tracks(make_rig, text):
    rig = make_rig(4)
    abilities = abilities_of(rig)
    try:
        tracks = played(text, rig)
    except Faults:
        return
    close(tracks, read_back(tracks, text, rig)[1], abilities)


def test_a_retimed_score_written_flat_keeps_its_sudden_moves_and_instants(make_rig):
    rig = make_rig()
    abilities = faster_when_full(abilities_of(rig))
    text = (
        "tempo 72\nphrase p\n  1 full sudden\n  2 hold\n  3 0.3\n  4 rest sudden\nphrase q\n  1 0.2\n  2 rest\n"
        "section a at 1:1\n  r.* p canon 1/3 times 4 every 5\n  r.2-3 q after 1/2 times 5 every 3 add\n"
    )
    tracks = played(text, rig, abilities)
    # Later by an odd time, but for the moves under way, which would last longer than a sudden one may.
    later = np.where(tracks.time_s > 2.0, tracks.time_s + 1.2345678901, tracks.time_s)
    warped = replace(tracks, time_s=later, duration_s=tracks.duration_s + 1.2345678901)
    flat, again = read_back(warped, text, rig, abilities)
    assert "sudden" in flat and "curve" in flat and "tempo 72" in flat
    close(warped, again, abilities)
    assert np.array_equal(warped.manner, again.manner)


def test_a_jump_out_of_a_move_becomes_a_phrase_of_its_own(make_rig):
    rig = make_rig(1)
    text = "phrase p\n  2 full linear\nphrase q\n  0 rest\n  1 0.5\nsection a at 1:1\n  r.1 p\n  r.1 q after 1\n"
    tracks = played(text, rig)
    assert STEP in tracks.manner
    flat, again = read_back(tracks, text, rig)
    assert "phrase moves.r.1.part2" in flat
    close(tracks, again, abilities_of(rig))


def test_a_jump_out_of_a_hold_is_a_step(make_rig):
    rig = make_rig(1)
    text = "phrase p\n  1 0.2\n  2 full step\nsection a at 1:1\n  r.1 p\n"
    flat, again = read_back(played(text, rig), text, rig)
    assert "  2s  30% step" in flat and "  2s  hold" not in flat
    close(played(text, rig), again, abilities_of(rig))


def test_what_goes_on_after_the_last_move_is_kept(make_rig):
    rig = make_rig(2)
    text = "phrase p 30\n  2 full\nsection a at 1:1\n  r.1 p\n"
    assert read_back(played(text, rig), text, rig)[1].duration_s == pytest.approx(30.0)
    text = "phrase p 30\n  2 rest\nsection a at 1:1\n  r.1 p\n"
    assert read_back(played(text, rig), text, rig)[1].duration_s == pytest.approx(30.0)


def test_the_head_keeps_the_score_s_own_words_and_cues_move(make_rig):
    rig = make_rig(1)
    text = (
        'title "Reeds"\nrig reeds.rig.toml   # ours\nmeter 3/4\ntempo 60 to 90 from 2:1 to 4:1\nkeep rhythm\n'
        'pin 1:1 every 2bars until 9:1\ncue "a" at 1:1\ncue "b" at 4:2 wait\n'
    )
    score = read_score(text, "t.score")
    tempo = tempo_map(score)
    cues = [Placed("a", 0.0, False), Placed("b", 12.5, True)]
    flat = write_flat(played(text, rig), score, rig, tempo, cues, "../reeds.rig.toml")
    assert flat.splitlines()[2:] == [
        'title   "Reeds"',
        "rig     ../reeds.rig.toml",
        "meter 3/4",
        "tempo 60 to 90 from 2:1 to 4:1",
        "keep    rhythm",
        "pin 1:1 every 2bars until 9:1",
        'cue "a" at 1:1',
        'cue     "b" at 12.5s wait',
    ]
    assert read_score(flat, "flat.score").cues[1].wait


def test_a_score_too_large_to_write_out_is_a_fault(make_rig):
    rig = make_rig(512)
    text = "phrase p\n  1/4 0.5\n  1/2 rest\nsection a at 1:1\n  r.* p times 200\n"
    score = read_score(text, "t.score")
    with pytest.raises(Faults, match="written out flat"):
        write_flat(played(text, rig), score, rig, tempo_map(score))


def test_what_goes_below_rest_cannot_be_written_and_rounding_is_not_below_rest(make_rig):
    rig = make_rig(1)
    text = "phrase p\n  1 0.5\n  2 rest\nsection a at 1:1\n  r.1 p\n"
    score, tracks = read_score(text, "t.score"), played(text, rig)
    curve = tracks.curve.copy()
    curve[tracks.manner != HOLD, 0] -= 1e-12
    assert "-" not in write_flat(replace(tracks, curve=curve), score, rig, tempo_map(score)).split("section")[0][90:]
    curve[:, 0] -= 1e-3
    with pytest.raises(Faults, match="below rest"):
        write_flat(replace(tracks, curve=curve), score, rig, tempo_map(score))
