"""Takes of a session and its map, in the window of a real session by hand."""

import os
import socket

import pytest
from mido import Message
from PySide6.QtCore import QRect, Qt
from PySide6.QtTest import QTest
from pythonosc.udp_client import SimpleUDPClient

from composer.load import load_score
from player.inputs.model import Control, Stroke
from player.window.map_view import NO_MIDI
from player.window.sheet import KeySheet

from .conftest import in_order, playing, until

MAP = """# by hand
[[bind]]
midi = { cc = 21, channel = 1 }   # the fader
fibers = "r.1"   # one
high = 0.8
"""


@pytest.fixture
def port():
    """A UDP port that is free just now."""
    with socket.socket(socket.AF_INET, socket.SOCK_DGRAM) as free:
        free.bind(("127.0.0.1", 0))
        return free.getsockname()[1]


def moved(window, port):
    """A hand that lifts a fiber, and lets it down again."""
    hand = SimpleUDPClient("127.0.0.1", port)
    for stroke in (0.3, 0.5, 0.1):
        hand.send_message("/drawcord/fiber/r.2", stroke)
        until(lambda wanted=stroke: abs(window.now.array("allowed")[1] / 0.3 - wanted) < 0.02, "the fiber does not follow")
    until(lambda: window.parts.takes.paths, "no take is listed")


def test_a_take_is_listed_sent_to_compose_as_a_section_and_played_back(room, files, port, monkeypatch):
    window = room.begun(osc=str(port), take="found.score")
    opened = []
    object.__setattr__(window.ways, "compose", lambda path: opened.append(path) or "opened in compose")
    playing(window)
    moved(window, port)
    window.do("record")
    until(lambda: "not recording" in window.told.inputs.get("take", ""), "is still recorded")
    takes = window.parts.takes
    assert [os.path.basename(path) for path in takes.paths] == ["found.take"]
    takes.to_compose()
    until(lambda: opened, "is not sent to compose")
    path = files / "bench-with-found.score"
    assert opened == [str(path)] and str(path) in window.told.lines[-1]
    loaded = load_score(str(path))
    assert {section.name for section in loaded.score.sections} > {"only"}
    assert (files / "bench.score").read_text().count("section") == 1
    takes.play_back()
    until(lambda: takes.playback is not None and takes.playback.link.on, "is not played back")
    mine = takes.playback.link.client
    assert mine.pid != window.link.client.pid and mine.about["targets"] == ["sim"]
    until(lambda: mine.snapshot().state == "playing", "does not play")
    assert window.now.state == "playing"
    takes.playback.close()


def test_the_same_take_sent_twice_is_two_files(room, files, port):
    window = room.begun(osc=str(port), take="found.score")
    object.__setattr__(window.ways, "compose", lambda path: "")
    playing(window)
    moved(window, port)
    for name in ("bench-with-found.score", "bench-with-found-2.score"):
        window.parts.takes.to_compose()
        until(lambda name=name: any(name + ": written" in line for line in window.told.lines), "is not written")
        assert (files / name).exists()


def test_a_score_alone_has_no_takes_and_the_panel_says_why(room):
    window = room.begun()
    in_order(window)
    assert not window.parts.takes.send.isEnabled() and "where a hand plays" in window.parts.takes.says.text()


class Ports:
    """Controllers, as the window hears them."""

    def __init__(self, messages):
        self._messages = list(messages)

    def poll(self):
        class Heard:
            def __init__(self, message):
                self.message = message

        heard, self._messages = [Heard(message) for message in self._messages], []
        return heard, []

    def close(self):
        self._messages = []


def test_a_control_that_is_moved_and_a_group_that_is_clicked_are_bound_in_the_file(room, files, port, monkeypatch):
    (files / "hand.map.toml").write_text(MAP)
    window = room.begun(osc=str(port), map_path="hand.map.toml")
    in_order(window)
    panel = window.parts.map
    assert panel.says.text() == NO_MIDI and not panel.learn.isEnabled()
    window.told.about["midi"] = ["box"]
    moves = [Message("control_change", control=30, value=value) for value in (1, 5, 9)]
    monkeypatch.setattr("player.window.map_view.MidiPorts", lambda now, names: Ports(moves))
    panel._stand()
    panel.learn.click()
    until(lambda: panel.control == Control("cc", 30, 1), "the control is not heard")
    assert window.parts.stack.currentIndex() == 0
    window.parts.meters.group_clicked.emit("r.*")
    text = (files / "hand.map.toml").read_text()
    assert text.startswith(MAP) and 'midi = { cc = 30, channel = 1 }\nfibers = "r.*"' in text
    assert panel.map.binds[1].deed == Stroke((0, 1, 2, 3), pickup=True)
    assert window.parts.stack.currentIndex() == 3 and panel.list.currentRow() == 1


def test_a_curve_and_a_range_are_drawn_changed_and_saved_with_comments_kept(room, files, port):
    (files / "hand.map.toml").write_text(MAP)
    window = room.begun(osc=str(port), map_path="hand.map.toml")
    in_order(window)
    panel = window.parts.map
    panel.list.setCurrentRow(0)
    assert panel.curve_view.accessibleDescription() == "linear, from 0 to 80 % of the stroke"
    panel.curve.setCurrentText("gentle")
    panel.high.setValue(65)
    text = (files / "hand.map.toml").read_text()
    assert text == MAP.replace("high = 0.8", "high = 0.65") + 'curve = "gentle"\n'
    assert panel.curve_view.accessibleDescription() == "gentle, from 0 to 65 % of the stroke"


def test_a_bound_control_that_is_moved_again_gets_the_other_fibers_and_no_second_bind(room, files, port):
    (files / "hand.map.toml").write_text(MAP)
    window = room.begun(osc=str(port), map_path="hand.map.toml")
    in_order(window)
    window.parts.map.heard(Control("cc", 21, 1))
    window.parts.hang.fiber_clicked.emit(2)
    assert (files / "hand.map.toml").read_text() == MAP.replace('"r.1"', '"r.3"')


def test_the_run_goes_by_a_changed_map_at_once(room, files, port):
    text = '[[bind]]\nosc = "/one"\nfibers = "r.1"\nhigh = 0.5\n'
    (files / "hand.map.toml").write_text(text)
    window = room.begun(score="bench.rig.toml", osc=str(port), map_path="hand.map.toml")
    playing_by_hand(window)
    hand = SimpleUDPClient("127.0.0.1", port)
    hand.send_message("/one", 1.0)
    until(lambda: abs(window.now.array("allowed")[0] / 0.3 - 0.5) < 0.01, "does not follow the map")
    window.parts.map.list.setCurrentRow(0)
    window.parts.map.high.setValue(20)
    until(lambda: window.now.array("wanted")[0] == 0.0, "the hand has not let go")
    hand.send_message("/one", 1.0)
    until(lambda: abs(window.now.array("allowed")[0] / 0.3 - 0.2) < 0.01, "does not follow the changed map")


def playing_by_hand(window):
    """A rig alone, armed and played."""
    in_order(window)
    window.do("arm")
    until(lambda: window.now is not None and window.now.state == "armed", "not armed")
    until(lambda: window.parts.deeds["play"].isEnabled(), "cannot be played")
    window.do("play")
    until(lambda: window.now.state == "playing", "does not play")


def test_a_map_with_a_fault_is_told_of_and_nothing_is_written(room, files, port):
    (files / "hand.map.toml").write_text(MAP)
    window = room.begun(osc=str(port), map_path="hand.map.toml")
    in_order(window)
    broken = MAP + "[[bind]]\nmidi = { cc = 900 }\n"
    (files / "hand.map.toml").write_text(broken)
    window.parts.map.heard(Control("cc", 30, 1))
    window.parts.meters.group_clicked.emit("r.*")
    assert "hand.map.toml:" in window.told.lines[-1] and (files / "hand.map.toml").read_text() == broken


def test_after_a_vent_a_held_press_arms_and_goes_on_and_the_vent_is_done_with(room, files, port):
    window = room.begun(osc=str(port))
    playing(window)
    QTest.keyClick(window, Qt.Key.Key_Escape)
    until(lambda: window.now.state == "vented" and "hold A" in window.parts.banner.text(), "not vented")
    until(lambda: window.parts.arm.isEnabled(), "cannot be armed again")
    QTest.keyPress(window, Qt.Key.Key_A)
    until(lambda: window.now.state == "playing", "does not go on")
    QTest.keyRelease(window, Qt.Key.Key_A)
    # Longer than a vent may take to be confirmed.
    QTest.qWait(900)
    assert window.now.state == "playing" and window.banner() == ("", False)


def test_dialogs_leave_vent_in_view(room):
    window = room.begun()
    in_order(window)
    window.do("keys")
    sheet = window.findChild(KeySheet)
    vent = window.parts.vent
    seen = QRect(vent.mapToGlobal(vent.rect().topLeft()), vent.size())
    assert sheet.isVisible() and not sheet.geometry().intersects(seen)
