"""A window at a real run: a small rig, a score for it, both in files of their own."""

import os

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import time

import pytest
from PySide6.QtTest import QTest
from PySide6.QtWidgets import QApplication

from player.commands import rehearse_ways
from player.window.window import RehearseWindow

PATIENCE_S = 60.0


@pytest.fixture
def files(tmp_path, monkeypatch, rig_text, score_text, own_runs):
    """A folder with bench.rig.toml and bench.score, in which the test works."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.rig.toml").write_text(rig_text)
    (tmp_path / "bench.score").write_text(score_text.format(times=100, length="1.5", up="0.6", down="1.2"))
    return tmp_path


def until(true, what):
    """Wait, with the application alive, until something is so; the time is only there so that a failure ends."""
    end = time.monotonic() + PATIENCE_S
    while not true():
        assert time.monotonic() < end, what
        QTest.qWait(10)


class Room:
    """Windows of a test, closed at its end."""

    def __init__(self):
        self.windows = []

    def begun(self, score="bench.score", targets=("sim",), rule="rest", **how):
        """A window that begins a run."""
        usual = dict.fromkeys(("map_path", "osc", "take", "start", "rate", "log", "rig")) | {"midi": (), "mend": False}
        ways = rehearse_ways.beginning(score=score, targets=targets, rule=rule, **(usual | how))
        return self.shown(RehearseWindow(ways))

    def attached(self, run, watch=False):
        """A window at a run that is on."""
        return self.shown(RehearseWindow(rehearse_ways.attaching(watch, None), run))

    def shown(self, window):
        """A window as large as a small screen, on it."""
        window.resize(1280, 800)
        window.show()
        self.windows.append(window)
        return window

    def close(self):
        """All windows closed, all runs over."""
        for window in self.windows:
            if window.link.client is not None:
                window.link.say("stop")
            window.close()
        self.windows.clear()


@pytest.fixture
def room(files, qapp):
    """Windows in the folder of `files`."""
    made = Room()
    yield made
    made.close()
    until(lambda: not rehearse_ways.names(), "a run goes on after its test")
    QApplication.processEvents()


def in_order(window):
    """Wait until the pre-flight is in order and everything is read."""
    until(lambda: window.told.marks is not None and window.told.marks["ok"], "no pre-flight in order")
    until(lambda: window._drawn, "the rig is not drawn")


def armed(window):
    """Arm by the key, held for a second."""
    from PySide6.QtCore import Qt

    in_order(window)
    QTest.keyPress(window, Qt.Key.Key_A)
    until(lambda: window.now is not None and window.now.state == "armed", "not armed")
    QTest.keyRelease(window, Qt.Key.Key_A)


def playing(window):
    """Armed and played by keys, until fibers move."""
    from PySide6.QtCore import Qt

    armed(window)
    until(lambda: window.parts.deeds["play"].isEnabled(), "cannot be played")
    QTest.keyClick(window, Qt.Key.Key_Space)
    until(lambda: window.now.state == "playing" and window.now.number("position_s") > 0.2, "does not play")
