"""The screen as text."""

import re

import numpy as np
import pytest

from player.engine.status import Status
from player.governor.causes import NONE, RATE
from player.live.inbox import Seen
from player.live.screen import KEYS, Scene, frame, meters_of
from player.live.source import View

FIBERS = (*(f"reed.{n}" for n in range(1, 7)), "silt.1", "silt.2")
STROKE = np.full(8, 0.25)
METERS = meters_of({"reeds": (0, 1, 2, 3, 4, 5)}, FIBERS, STROKE)


def scene(told=(), seen=(), refused=None, **view):
    cut = np.full(8, NONE, dtype=np.int8)
    cut[:2] = RATE
    shown = {
        "wanted": STROKE * 0.8, "allowed": STROKE * 0.4, "cut": cut, "by": STROKE * 0.4,
        "touched": np.arange(8) < 6, "air_share": 0.5, "air_left": 0.42, "counts_a_minute": 96.0, "held": True,
        "binds_playing": frozenset(),
    } | view  # fmt: skip
    status = Status("playing", "playing", 4.0, 60.0, "ebb", "bore", "", 3, 0, 800, 2, 0, 0.0004, (("curtain", "armed"),))
    return Scene(
        "Estuary", status, "2:1", View(**shown), seen, refused or {}, {"curtain": 612.0}, 0.4, 100.0, told, "recording a.take",
        not shown["held"],
    )  # fmt: skip


def plain(lines):
    return [re.sub("\x1b\\[[0-9;]*m", "", line) for line in lines]


@pytest.mark.parametrize("width,height", [(79, 24), (199, 60), (40, 12), (120, 30)])
@pytest.mark.parametrize("colour", [False, True])
def test_a_frame_has_exactly_its_lines_and_none_is_too_wide(width, height, colour):
    seen = tuple(Seen(f"BOX {n}: a port with a long name", "cc 21: reeds 0.50", 99.0, 3) for n in range(9))
    lines = frame(scene(["x" * 300] * 50, seen, {"osc address": 3}, held=False), METERS, width, height, colour)
    assert len(lines) == height and max(map(len, plain(lines))) <= width
    assert colour == any("\x1b" in line for line in lines)


def test_a_meter_tells_wanted_allowed_and_what_cuts_how_many():
    row = next(line for line in frame(scene(), METERS, 79, 24, False) if "reeds" in line)
    assert "80 %" in row and "40 %" in row and "rate 2/6" in row and row.startswith(" *reeds")
    bar = row[row.index("█") : row.index("rate")]
    assert bar.count("█") == pytest.approx(0.4 * len(bar.rstrip()), abs=1) and "▏" in bar


def test_fibers_of_no_group_share_a_row_by_the_beginning_of_their_names():
    assert [name for name, _ in METERS.rows] == ["reeds", "silt.*"]


def test_state_place_tempo_cue_supply_lateness_boards_and_take_are_shown():
    text = "\n".join(frame(scene(), METERS, 119, 24, False))
    for part in ("playing", "2:1", "96/min", 'next "bore"', "air  42 %", "curtain 612 kPa", "filling at 50 %", "late 2 of 800",
                 "curtain armed", "recording a.take"):  # fmt: skip
        assert part in text


def test_sources_are_shown_with_their_last_value_and_silent_ones_are_marked():
    seen = (Seen("BOX", "cc 21: reeds 0.50", 99.5, 3), Seen("PAD", "the port is gone", 90.0, 3, True))
    lines = frame(scene(seen=seen), METERS, 79, 24, False)
    assert any(line.startswith(" • BOX") and "reeds 0.50" in line for line in lines)
    assert any(line.startswith(" ! PAD") and "the port is gone" in line for line in lines)


def test_what_was_refused_is_shown_by_reason():
    assert any("refused: 3 osc address, 1 midi stray" in line
               for line in frame(scene(refused={"osc address": 3, "midi stray": 1}), METERS, 79, 24, False))  # fmt: skip


def test_every_key_is_on_the_screen_and_the_latest_news_too():
    text = " ".join(frame(scene(["old"] * 30 + ["the port is gone"]), METERS, 79, 24, False))
    assert all(f"{key} {does}" in text for key, does in KEYS) and "the port is gone" in text


def test_a_rig_that_is_to_be_held_says_so_while_it_is_not():
    assert any("letting go brings all to rest" in line for line in frame(scene(held=False), METERS, 79, 24, False))


def test_where_there_is_room_every_fiber_has_a_meter_of_its_own():
    text = "\n".join(frame(scene(), METERS, 199, 60, False))
    assert all(name in text for name in FIBERS)
