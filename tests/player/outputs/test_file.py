"""A recording under way."""

import numpy as np
import pytest

from composer.faults import Faults
from player.outputs.base import LinkLost
from player.outputs.file import File, places_of
from player.outputs.recording import read


@pytest.fixture
def rig(make_rig):
    return make_rig(5, boards=2)


def recorded(path):
    return read(path.read_bytes(), str(path))


def test_what_is_sent_is_in_the_file_by_board_and_channel(rig, tmp_path):
    path = tmp_path / "a.rec"
    output = File(rig, ("board1", "board2"), str(path), 100.0)
    output.open()
    output.send(10.0, np.array([0.0, 0.25, 0.5, 0.75, 1.0]))
    output.send(10.01, np.ones(5))
    output.rest(0.0)
    output.close()
    found = recorded(path)
    assert found.drivers == (("board1", 3), ("board2", 3)) and found.rate_Hz == 100.0
    assert np.allclose(found.time_s, [0.0, 0.01])
    assert found.values[0].tolist() == [0, 16384, 32768, 49151, 65535, 0]
    assert found.complete and found.ended == "rest"


def test_a_file_for_one_board_has_that_board_alone(rig, tmp_path):
    path = tmp_path / "a.rec"
    output = File(rig, ("board2",), str(path), 100.0)
    output.open()
    output.send(0.0, np.array([0.0, 0.0, 0.0, 0.5, 1.0]))
    output.close()
    assert recorded(path).drivers == (("board2", 3),)
    assert recorded(path).values[0].tolist() == [32768, 65535, 0]


def test_the_target_stays_as_it_was_until_the_recording_is_closed(rig, tmp_path):
    path = tmp_path / "a.rec"
    path.write_text("before")
    output = File(rig, ("board1", "board2"), str(path), 100.0)
    output.open()
    output.send(0.0, np.zeros(5))
    assert path.read_text() == "before"
    output.close()
    output.close()
    assert recorded(path).complete and [p.name for p in tmp_path.iterdir()] == ["a.rec"]


def test_where_nothing_was_sent_nothing_is_left(rig, tmp_path):
    path = tmp_path / "a.rec"
    path.write_text("before")
    output = File(rig, ("board1", "board2"), str(path), 100.0)
    output.open()
    output.close()
    assert path.read_text() == "before" and len(list(tmp_path.iterdir())) == 1


def test_a_place_that_cannot_be_written_is_found_when_it_is_opened(rig, tmp_path):
    with pytest.raises(Faults, match="no folder"):
        File(rig, ("board1",), str(tmp_path / "nowhere" / "a.rec"), 100.0).open()


def test_sending_after_closing_is_a_lost_link(rig, tmp_path):
    output = File(rig, ("board1",), str(tmp_path / "a.rec"), 100.0)
    output.open()
    output.close()
    with pytest.raises(LinkLost):
        output.send(0.0, np.zeros(5))


def test_fibers_of_other_boards_have_no_place(rig):
    assert places_of(rig, (("board2", 3),)).tolist() == [-1, -1, -1, 0, 1]
