"""The report of a retiming, in sentences and as JSON."""

import json

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.report.retime import as_json, is_good, sentences
from composer.retime.retiming import retime
from composer.shapes import NAMES, PROGRESS
from composer.tracks import HOLD, MOVE, Tracks


class Seconds:
    """Places that are the seconds themselves, as bar 1."""

    def say_place(self, at_s):
        return f"1:{at_s:g}"


def tracks_of(*fibers, line=7):
    """For each fiber (second, target or None for a hold) in turn, straight; all asked for by one line."""
    first, times, curves, manners = [0], [], [], []
    for fiber in fibers:
        value = 0.0
        for second, target in fiber:
            curve = np.zeros(6)
            if target is not None:
                curve += (target - value) * PROGRESS["linear"]
            curve[0] += value
            times.append(second), curves.append(curve), manners.append(HOLD if target is None else MOVE)
            value = value if target is None else target
        first.append(len(times))
    manner = np.array(manners, dtype=np.int8)
    count = len(times)
    return Tracks(
        np.array(first), np.array(times, dtype=float), np.array(curves), manner,
        np.where(manner == MOVE, NAMES.index("linear"), -1).astype(np.int8), np.where(manner == MOVE, line, 0).astype(np.int32),
        np.zeros(count, np.int32), float(max(times)),
    )  # fmt: skip


@pytest.fixture
def told(make_rig):
    def tell(tracks, pins=(), rig=None, **more):
        rig = rig or make_rig(tracks.fibers)
        abilities = abilities_of(rig)
        found = retime(tracks, abilities, rig, np.asarray(pins, dtype=float), **more)
        checked = check(found.tracks, rig, abilities)
        report = as_json(found, checked, rig, Seconds())
        json.dumps(report, allow_nan=False)
        assert report["ok"] == is_good(found, checked)
        return sentences(found, checked, rig, Seconds()), report

    return tell


def test_a_score_that_the_rig_can_do_is_told_in_one_sentence(told):
    lines, report = told(tracks_of([(0.0, 0.3), (1.0, None)]))
    assert lines == ["Nothing had to move."]
    assert (report["ok"], report["cost"], report["hits_moved"], report["leads"]) == (True, 0.0, [], [])


def test_a_moved_hit_is_told_with_its_line_and_what_holds_it(told):
    lines, report = told(tracks_of([(0.0, 0.3), (0.25, None)]))
    assert lines == [
        "1 hit moved. Cost 0.25 stroke-seconds, proven to be the least there is. The score lasts 0.250 s longer.",
        "  1:0.25: 0.250 s later, r.1 (line 7)",
        "    r.1 needs 0.500 s for its move to 1:0.25 at its fastest fill, and cannot leave before the start",
    ]
    (hit,) = report["hits_moved"]
    assert (hit["was_s"], hit["now_s"], hit["fibers"], hit["line"]) == (0.25, 0.5, ["r.1"], 7)
    assert hit["held_by"]["says"] == lines[2].strip()
    assert report["bound"] == report["cost"] == pytest.approx(0.25)


def test_fibers_that_leave_alike_share_a_line(told):
    late = [(0.0, None), (2.0, 0.3), (2.25, None)]
    lines, report = told(tracks_of(late, late))
    assert lines[0].startswith("0 hits moved, and 2 moves leave at another time.")
    assert lines[1:] == ["  r.1 and r.2 leave 0.250 s earlier than 1:2 (line 7)"]
    assert [lead["fiber"] for lead in report["leads"]] == ["r.1", "r.2"]


def test_hits_that_rhythm_carries_along_share_a_line(told):
    track = [(0.0, 0.3), (0.25, 0.0), (1.25, 0.3), (2.25, 0.0), (3.25, None)]
    lines, report = told(tracks_of(track), keep="rhythm")
    assert lines[1] == "  1:0.25 to 1:3.25 (4 hits): 0.250 s later, r.1 (line 7)"
    assert lines[2].startswith("    r.1 needs 0.500 s for its move to 1:0.25")
    assert [hit["held_by"]["kind"] for hit in report["hits_moved"]] == ["move", "rhythm", "rhythm", "rhythm"]
    assert len(report["hits_moved"]) == 4


def test_pins_too_close_are_told_with_what_would_mend_them_and_nothing_is_changed(told):
    lines, report = told(tracks_of([(0.0, 0.3), (0.3, None)]), [0.3])
    assert lines[:2] == [
        "Between the start of the score and the pin at 1:0.3 r.1 (line 7) lacks 0.200 s.",
        "  Move one of the two apart by 0.200 s, give the pin that much (`within`), or let these moves go 0.5999 of their way "
        "(--shrink).",
    ]
    assert lines[2] == "Nothing was changed, so these snags are left:"
    assert (report["ok"], report["cost"], report["bound"]) == (False, None, None)
    assert report["pins_short"] == [{"from": "1:0", "to": "1:0.3", "short_s": pytest.approx(0.2), "fibers": ["r.1"]}]


def test_what_the_advice_says_mends_pins_that_are_too_close(told):
    tracks = tracks_of([(0.0, 0.3), (0.3, None)])
    assert told(tracks, [0.3], give_s=np.array([0.2]))[1]["ok"]
    assert told(tracks_of([(0.0, 0.3 * 0.5999), (0.3, None)]), [0.3])[1]["ok"]
    lines, report = told(tracks, [0.3], shrink=True)
    assert report["ok"]
    assert lines[-1] == "r.1 goes 0.6 of its way in the move that lands at 1:0.3 (line 7)"


def test_a_pin_that_costs_is_told_and_one_that_holds_nothing_back_is_not(told):
    track = [(0.0, 0.3), (1.0, 0.0), (1.5, None)]
    lines, report = told(tracks_of(track, [(0.0, 0.3), (0.6, 0.3 - 0.27), (1.5, None)]), [1.5])
    assert [pin["at_s"] for pin in report["pins"]] == [1.5]
    costs = [line for line in lines if line.startswith("The pin at")]
    assert bool(costs) == (report["pins"][0]["strokes"] != 0.0)
    assert not [line for line in told(tracks_of([(0.0, 0.3), (1.0, None)]), [0.9])[0] if line.startswith("The pin at")]


def test_where_air_is_short_the_gap_to_the_bound_is_told(told, make_rig):
    one = [(0.0, 0.3), (0.5, None)]
    rig = make_rig(4, air_mL=30.0, receiver_L=0.012, compressor_L_min=0.9)
    lines, report = told(tracks_of(one, one, one, one), rig=rig)
    assert report["ok"] and report["bound"] <= report["cost"]
    assert "    receiver and compressor have no more air between the start and 1:0.5" in lines


def test_what_time_cannot_mend_is_listed_at_the_places_as_written(told):
    lines, report = told(tracks_of([(0.0, 0.4), (2.0, None)]))
    assert not report["ok"]
    place = lines.index("What time cannot mend:")
    assert "stroke" in {snag["kind"] for snag in report["snags_left"]}
    assert len(lines) > place + 1


def test_an_answer_that_time_cut_short_is_said_to_be_the_best_known(told):
    ticks = iter(range(1000))
    # Landing earlier at 1 s would cost less than what the second move can only push, so one pass proves nothing.
    light = tracks_of([(0.0, 0.03), (1.0, 0.3), (1.1, None)])
    lines, report = told(light, limit_s=0.5, clock=lambda: float(next(ticks)))
    assert report["stopped"] and report["ok"]
    assert "the best known when time was up" in lines[0]
