"""The window at a real run: arm, play, pause, VENT, watching, leaving, an engine that is gone."""

import os
import signal
import subprocess
import sys
from dataclasses import replace
from types import SimpleNamespace

from PySide6.QtCore import Qt
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication, QInputDialog, QPushButton, QWidget

from composer.picture.palette import contrast
from player.commands import rehearse_ways
from player.engine.process.client import Client
from player.engine.process.room import path_of
from player.window import hold_button, words
from player.window.actions import ACTIONS, WATCHES
from player.window.chrome import VENT_BACK, VENT_INK

from .conftest import armed, in_order, playing, until


def state(window):
    return window.now.state if window.now is not None else ""


def test_a_press_that_is_let_go_too_soon_does_not_arm(room, monkeypatch):
    window = room.begun()
    in_order(window)
    # However slow the machine is, this press is too short.
    monkeypatch.setattr(hold_button, "HELD_MS", 3_600_000)
    QTest.keyPress(window, Qt.Key.Key_A)
    QTest.qWait(300)
    assert 0.0 < window.parts.arm.share < 1.0
    QTest.keyRelease(window, Qt.Key.Key_A)
    until(lambda: window.parts.arm.share == 0.0, "is still held")
    monkeypatch.undo()
    QTest.qWait(1200)
    assert state(window) == "idle" and window.stage == "before"


def test_a_key_that_repeats_itself_without_saying_so_is_still_held(room):
    window = room.begun()
    in_order(window)
    QTest.keyPress(window, Qt.Key.Key_A)
    while state(window) != "armed":
        share = window.parts.arm.share
        QTest.keyRelease(window, Qt.Key.Key_A)
        QTest.keyPress(window, Qt.Key.Key_A)
        assert window.parts.arm.share >= share or state(window) == "armed" or share > 0.9
        QTest.qWait(30)
    QTest.keyRelease(window, Qt.Key.Key_A)


def test_a_press_held_for_a_second_arms_by_mouse_too(room):
    window = room.begun()
    in_order(window)
    QTest.mousePress(window.parts.arm, Qt.MouseButton.LeftButton)
    until(lambda: state(window) == "armed", "not armed")
    QTest.mouseRelease(window.parts.arm, Qt.MouseButton.LeftButton)


def test_a_rehearsal_by_keys_plays_pauses_goes_on_goes_to_the_cue_and_rests(room):
    window = room.begun()
    playing(window)
    assert np_moves(window)
    QTest.keyClick(window, Qt.Key.Key_Space)
    until(lambda: state(window) == "paused", "does not pause")
    QTest.keyClick(window, Qt.Key.Key_Return)
    until(lambda: state(window) == "playing", "does not go on")
    QTest.keyClick(window, Qt.Key.Key_R)
    until(lambda: window.stage == "over", "does not come to rest")
    assert window.told.last[0] == "ended" and window.told.last[1]["report"]["ended"] == "stopped"


def np_moves(window):
    until(lambda: window.now.array("wanted").max() > 0.0, "nothing is wanted")
    return window.parts.hang.shown is not None


def test_escape_vents_from_a_dialog_and_the_dialog_stays(room):
    window = room.begun()
    playing(window)
    dialog = QInputDialog(window)
    dialog.setLabelText("a name")
    dialog.show()
    field = dialog.findChild(QWidget, "")
    until(lambda: dialog.isVisible(), "no dialog")
    QTest.keyClick(dialog, Qt.Key.Key_Escape)
    until(lambda: state(window) == "vented", "not vented")
    assert dialog.isVisible() and field is not None
    dialog.close()


def test_escape_vents_while_somebody_writes_and_other_keys_are_written(room):
    window = room.begun()
    playing(window)
    window.show_panel(3)
    field = window.parts.map.low.lineEdit()
    window.parts.map.low.setEnabled(True)
    window.activateWindow()
    field.setFocus()
    until(lambda: QApplication.focusWidget() is not None, "no focus")
    QTest.keyClick(window.parts.map.low, Qt.Key.Key_R)
    QTest.qWait(100)
    assert state(window) == "playing"
    QTest.keyClick(window.parts.map.low, Qt.Key.Key_Escape)
    until(lambda: state(window) == "vented", "not vented")
    assert window.focusWidget() is window


def test_vent_is_said_from_within_the_keys_handler(room):
    window = room.begun()
    playing(window)
    said = []
    before = window.link.client.say
    window.link.client.say = lambda name, **fields: said.append(name) or before(name, **fields)
    QTest.keyClick(window, Qt.Key.Key_Escape)
    # No event has been worked off since.
    assert said == ["vent"]
    until(lambda: state(window) == "vented", "not vented")


def test_the_vent_button_vents_as_it_goes_down(room):
    window = room.begun()
    playing(window)
    QTest.mousePress(window.parts.vent, Qt.MouseButton.LeftButton)
    until(lambda: state(window) == "vented", "not vented")
    QTest.mouseRelease(window.parts.vent, Qt.MouseButton.LeftButton)


def test_a_second_window_watches_can_vent_and_cannot_arm_and_its_buttons_say_why(room):
    window = room.begun()
    in_order(window)
    second = room.attached(window.link.client.run)
    until(lambda: second._drawn and second.told.marks is not None, "does not attach")
    until(lambda: second.told.taken, "is not told who commands")
    for name in ("arm", "play", "rest"):
        button = second.parts.deeds[name]
        assert not button.isEnabled() and WATCHES in button.toolTip() and button.accessibleDescription() == WATCHES
    assert second.parts.why.text() == WATCHES
    QTest.keyPress(second, Qt.Key.Key_A)
    QTest.qWait(1300)
    QTest.keyRelease(second, Qt.Key.Key_A)
    assert state(second) == "idle"
    # Said past the window, the run itself refuses it.
    second.link.say("arm")
    until(lambda: any("is for the front end that commands" in line for line in second.told.lines), "is not refused")
    playing(window)
    until(lambda: state(second) == "playing", "does not see it")
    QTest.keyClick(second, Qt.Key.Key_Escape)
    until(lambda: state(window) == "vented", "does not vent")


def test_closing_the_window_brings_the_run_to_rest_by_its_rule(room):
    window = room.begun()
    playing(window)
    run = window.link.client.run
    watcher = Client.at(path_of(run), commands=False)
    window.close()
    until(lambda: any(name == "ended" for name, _ in watcher.hear(0.0)), "does not end")
    assert watcher.snapshot().state == "idle"
    watcher.close()


def test_closing_the_window_lets_a_run_go_on_whose_rule_that_is(room):
    window = room.begun(rule="go-on")
    playing(window)
    run = window.link.client.run
    window.close()
    second = room.attached(run)
    until(lambda: second.now is not None and second.link.client.commands, "nobody can take it over")
    at = second.now.number("position_s")
    until(lambda: second.now.number("position_s") > at + 0.3, "does not go on")
    QTest.keyClick(second, Qt.Key.Key_R)
    until(lambda: second.stage == "over", "does not rest")


def test_an_engine_that_is_killed_is_told_of_and_vent_says_that_it_reaches_nobody(room):
    window = room.begun()
    playing(window)
    os.kill(window.link.client.pid, signal.SIGKILL)
    until(lambda: window.parts.banner.text() == words.GONE, "is not told")
    QTest.keyClick(window, Qt.Key.Key_Escape)
    assert window.stage == "over" and not window.parts.deeds["play"].isEnabled()
    until(lambda: "not known any more" in window.parts.instruments.values["boards"].text(), "boards are told as they were")
    window.do("vent")
    assert "nothing is vented" in window.told.lines[-1]


def test_an_engine_that_stands_still_is_told_of(room):
    window = room.begun()
    playing(window)
    pid = window.link.client.pid
    os.kill(pid, signal.SIGSTOP)
    try:
        until(lambda: window.parts.banner.text() == words.STANDS, "is not told")
    finally:
        os.kill(pid, signal.SIGCONT)
    until(lambda: window.parts.banner.text() == "", "does not see that it moves again")


def test_a_run_that_has_ended_begins_again(room):
    window = room.begun()
    playing(window)
    first = window.link.client.pid
    QTest.keyClick(window, Qt.Key.Key_R)
    until(lambda: window.stage == "over", "does not rest")
    QTest.keyClick(window, Qt.Key.Key_B)
    until(lambda: window.link.client is not None and window.stage == "before", "does not begin again")
    assert window.link.client.pid != first
    in_order(window)


def test_a_run_that_is_not_there_is_told_of_in_a_sentence(room):
    window = room.attached("nothing-1")
    until(lambda: window.wrong, "is not told")
    assert "no run answers at" in window.parts.banner.text()
    assert not window.parts.deeds["arm"].isEnabled()


def test_a_port_that_is_not_there_is_told_in_the_preflight(room):
    window = room.begun(targets=("serial:/dev/nothing-there",))
    until(lambda: window.wrong, "is not told")
    assert any(kind == "no" and "/dev/nothing-there" in text for kind, text, _ in window.parts.preflight.rows)


def test_a_rehearsal_with_the_board_in_c_and_its_line_pulled(room, files):
    device = subprocess.Popen(
        [sys.executable, "-m", "player.commands.main", "device", "bench.rig.toml", "--portable"],
        stdout=subprocess.PIPE, text=True,
    )  # fmt: skip
    path = device.stdout.readline().strip()
    try:
        window = room.begun(targets=(f"serial:{path}",))
        playing(window)
        until(lambda: "armed" in window.parts.instruments.values["boards"].text(), "no link")
        until(lambda: window.now.array("sensed").max() > 0.0, "nothing is sensed")
        until(lambda: "kPa" in window.parts.instruments.values["supply"].text(), "the supply is not told")
    finally:
        device.terminate()
        device.communicate(timeout=60)
    until(lambda: "lost" in window.parts.banner.text(), "a board that is gone is not told of")
    until(lambda: "has vanished" in window.parts.banner.text(), "what has become of it is not told")


def test_a_fault_that_brings_all_to_rest_is_said_large_and_a_rest_that_was_asked_for_is_not(room):
    window = room.begun()
    in_order(window)
    fault = "main: bad command: the board did not understand what it was sent"
    before, stage = window.now, window.stage
    window.told.since += [fault, "All is at rest or vented. Press b ..."]
    window.stage = "running"
    window.now = SimpleNamespace(state="idle", texts=lambda name: ["idle"], number=lambda name: window._clock())
    unasked = window.banner()
    window._rested = True
    asked = window.banner()
    # Before anybody else looks.
    window.now, window.stage = before, stage
    assert unasked == (f"BROUGHT TO REST: {fault}; hold A to arm and go on", True)
    assert asked == ("", False)


def test_tonights_margins_come_into_the_preflight(room):
    window = room.begun()
    in_order(window)
    until(lambda: any("The receiver is lowest" in text for _, text, _ in window.parts.preflight.rows), "no margins")


def test_every_button_has_a_name_and_every_key_a_row_in_the_sheet(room):
    window = room.begun()
    in_order(window)
    window.do("keys")
    for button in window.findChildren(QPushButton):
        assert button.accessibleName() and button.text()
    keys = [key for row in ACTIONS.values() for key in row.keys]
    assert len(keys) == len(set(keys))


def test_vent_can_be_read_in_every_light_and_stays_in_view(room):
    window = room.begun()
    in_order(window)
    assert contrast(VENT_INK, VENT_BACK) >= 4.5
    for size in ((1280, 800), (1920, 1080), (3840, 2160)):
        window.resize(*size)
        QTest.qWait(20)
        for _ in range(3):
            window.do("dim")
            at = window.parts.vent.mapTo(window, window.parts.vent.rect().center())
            assert window.rect().contains(at) and window.parts.vent.isVisible()


def test_nothing_blinks_but_a_fault(room):
    window = room.begun()
    playing(window)
    window._blinked()
    assert not window.parts.banner.isVisible()
    QTest.keyClick(window, Qt.Key.Key_Escape)
    until(lambda: window.parts.banner.isVisible(), "no banner")
    assert window.parts.banner.property("calm")
    window._blinked()
    assert not window.parts.banner.property("pale")


def test_a_run_of_another_user_is_refused_in_words(room, monkeypatch):
    window = room.begun()
    in_order(window)
    run = window.link.client.run
    monkeypatch.setattr("player.engine.process.peers.peer_uid", lambda connection: os.geteuid() + 1)
    second = room.attached(run)
    until(lambda: second.wrong, "is not refused")
    assert "belongs to another user" in second.parts.banner.text() and second.link.client is None
    monkeypatch.undo()


def test_cautions_are_there_for_worn_and_overhead_rigs_alone(make_rig):
    plain = make_rig(4)
    assert words.cautions(plain) == ()
    assert words.cautions(replace(plain, worn=True)) == words.CAUTIONS["worn"]
    high = replace(plain, fibers=tuple(replace(one, at_m=(0.0, 0.0, 2.4)) for one in plain.fibers))
    assert words.cautions(high) == words.CAUTIONS["overhead"]


def test_runs_are_listed_in_words(room):
    window = room.begun()
    armed(window)
    rows = rehearse_ways.rows()
    assert [row.name for row in rows] == [window.link.client.run]
    assert "armed" in rows[0].says and "Bench piece to sim, commanded elsewhere" in rows[0].says


def test_a_vent_is_put_down_to_the_board_that_vented_whatever_is_said_after_it():
    said = ['waiting at cue "ebb"', "main: watchdog: heard nothing in time", "All is at rest or vented, and disarmed: …"]
    assert words.why_vented(said, ["main"]) == "main: watchdog: heard nothing in time"
    assert words.why_vented(["vented by the operator"], ["main"]) == "vented by the operator"
    assert words.why_vented([], ["main"]) == "asked for elsewhere"


def test_a_run_that_has_come_to_its_end_all_the_same_tells_of_its_faults():
    assert words.faults_said({"faults": []}) == words.faults_said({}) == ""
    assert words.faults_said({"faults": [{"say": "r.1 falls"}]}) == "A fault on the way: r.1 falls"
    assert words.faults_said({"faults": [{"say": "a"}, {"say": "b"}]}) == "2 faults, the first on the way: a"


def test_a_fault_that_brings_all_to_rest_is_the_line_just_before_that_is_said():
    after = "All is at rest or vented. Press b ..."
    assert words.why_rested(["main: bad command: not understood", after], ["main"]) == "main: bad command: not understood"
    assert words.why_rested(["r.1 does not move: sensed at 3 %", after], ["r.1"]) == "r.1 does not move: sensed at 3 %"
    assert words.why_rested(["main: the board is heard again", "not recording", after], ["main"]) == ""
    assert words.why_rested([after], ["main"]) == words.why_rested([], ["main"]) == ""


def test_what_is_wrong_is_said_above_the_fibers_and_hides_none(room):
    window = room.begun()
    in_order(window)
    buttons = {name: button.geometry() for name, button in window.parts.deeds.items()}
    hang = window.parts.hang
    free = hang.shown.mapTo(window, hang.shown.rect().topLeft()).y()
    window.wrong = ["a board is not there"]
    window._show_banner()
    QApplication.processEvents()
    banner = window.parts.banner
    top = hang.shown.mapTo(window, hang.shown.rect().topLeft()).y()
    assert banner.isVisible() and banner.geometry().bottom() < top
    assert {name: button.geometry() for name, button in window.parts.deeds.items()} == buttons
    window.wrong = []
    window._show_banner()
    QApplication.processEvents()
    assert hang.shown.mapTo(window, hang.shown.rect().topLeft()).y() == free
