"""The report of a check."""

import json
from types import SimpleNamespace

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.report.check import MOST_TOLD, as_json, as_text, minutes, waiting_notes
from composer.report.sentences import Teller
from composer.tracks import HOLD, MOVE, Tracks


def _fast(fibers: int, times: int = 1, apart_s: float = 2.0) -> Tracks:
    """Every fiber filled and emptied `times` in a straight line within a tenth of a second each, asked for by line 23."""
    each = 4 * times + 1
    knots = [t for n in range(times) for t in (n * apart_s, n * apart_s + 0.5, n * apart_s + 0.6, n * apart_s + 0.7)]
    curve = np.zeros((each, 6))
    curve[1::4, 1], curve[2::4, 0], curve[2::4, 1] = 0.2, 0.2, -0.2
    manner = np.full(each, HOLD, dtype=np.int8)
    manner[1::4] = manner[2::4] = MOVE
    line = np.where(manner == MOVE, 23, 0).astype(np.int32)
    return Tracks(
        first=np.arange(fibers + 1) * each,
        time_s=np.tile([*knots, knots[-1] + 1.0], fibers),
        curve=np.tile(curve, (fibers, 1)),
        manner=np.tile(manner, fibers),
        shape=np.tile(np.where(manner == MOVE, 1, -1).astype(np.int8), fibers),
        line=np.tile(line, fibers),
        phrase_line=np.tile(line // 3, fibers).astype(np.int32),
        duration_s=knots[-1] + 1.0,
    )


def _say(seconds: float) -> str:
    return f"{int(seconds // 4) + 1}:{seconds % 4 + 1:g}"


def _both(rig, tracks):
    return check(tracks, rig, abilities_of(rig)), Teller(tracks, rig, _say)


def test_the_json_has_the_keys_and_the_order_of_the_contract(make_rig):
    checked, teller = _both(make_rig(2), _fast(2))
    told = as_json("a.score", checked, teller)
    assert [k for k in told if k != "notes"] == ["score", "rig", "ok", "duration_s", "fibers", "moves", "snags", "air", "duty"]
    snag = told["snags"][0]
    assert list(snag)[:10] == ["kind", "fiber", "from_s", "to_s", "place", "needs", "has", "unit", "line", "say"]
    assert (snag["kind"], snag["fiber"], snag["place"], snag["unit"], snag["line"]) == ("rate", "r.1", "1:1.5", "1/s", 23)
    assert (snag["needs"], snag["has"]) == pytest.approx((2.0, 0.3))
    assert (told["ok"], told["fibers"], told["moves"], len(told["snags"])) == (False, 2, 4, 2)
    assert set(told["air"]) == {"lowest_kPa", "used_L"}
    assert set(told["duty"]) == {"highest", "fiber"}


def test_no_number_in_the_json_is_beyond_json(make_rig):
    checked, teller = _both(make_rig(1, accel=1.0, max_hold_s=0.01), _fast(1))
    assert len(checked.snags) > 1
    json.dumps(as_json("a.score", checked, teller), allow_nan=False)


def test_a_score_in_order_is_said_to_be(make_rig):
    checked, teller = _both(make_rig(1, fill=9.0, exhaust=9.0), _fast(1))
    assert as_json("a.score", checked, teller)["ok"]
    assert as_text("a.score", checked, teller).startswith("a.score: 1 fiber of Bench, 2 moves, 1.7 s: the rig can do all of it")


def test_the_list_tells_the_latest_first_with_its_line(make_rig):
    checked, teller = _both(make_rig(1), _fast(1, times=3))
    places = [line for line in as_text("a.score", checked, teller).splitlines() if line.startswith("a.score:23: ")]
    assert len(places) == 3
    assert "bar 2 count 1.7" in places[0]
    assert "bar 1 count 1.7" in places[-1]


def test_fibers_asked_for_the_same_share_a_line_of_the_list(make_rig):
    checked, teller = _both(make_rig(5), _fast(5))
    text = as_text("a.score", checked, teller)
    assert text.count("r.1-5 are asked") == 1
    assert "they need 0.67 s (the worst of 2 moves in a row)." in text
    assert "(Its phrase: line 7.)" in text


def test_a_long_list_is_cut_and_says_so(make_rig):
    checked, teller = _both(make_rig(1), _fast(1, times=2 * MOST_TOLD))
    text = as_text("a.score", checked, teller)
    assert f"and {MOST_TOLD} more earlier in the score; --json lists them all" in text


def test_a_cue_that_waits_in_mid_move_is_noted_and_one_that_waits_in_a_hold_is_not(make_rig):
    tracks = _fast(1)
    teller = Teller(tracks, make_rig(1), _say)
    cues = [
        SimpleNamespace(name=n, seconds=s, wait=w)
        for n, s, w in (("solo", 0.55, True), ("off", 0.2, True), ("go", 0.55, False))
    ]
    assert waiting_notes(cues, teller) == ['the cue "solo" waits at bar 1 count 1.55 while r.1 is moving']


def test_a_length_is_said_in_minutes_where_it_is_long():
    assert (minutes(61.5), minutes(216.2), minutes(3599.99)) == ("61.5 s", "3:36.2 min", "60:00.0 min")


def test_a_receiver_that_is_never_drawn_down_by_half_a_kilopascal_stays_where_it_is(make_rig):
    little, much = make_rig(1, air_mL=0.1), make_rig(1, air_mL=300.0)
    assert "the receiver stays at 800 kPa (450 kPa" in as_text("a.score", *_both(little, _fast(1)))
    assert "the receiver falls to 7" in as_text("a.score", *_both(much, _fast(1)))
