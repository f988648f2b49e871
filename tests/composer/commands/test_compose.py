"""`drawcord compose` where there is no screen, and with input that is none."""

import os
import subprocess
import sys

import pytest


def compose(*words):
    """Run the command without a screen."""
    environment = {name: value for name, value in os.environ.items() if name not in ("DISPLAY", "WAYLAND_DISPLAY")}
    environment["QT_QPA_PLATFORM"] = "offscreen"
    return subprocess.run(
        [sys.executable, "-m", "player.commands.main", "compose", *words], capture_output=True, text=True, env=environment
    )


@pytest.mark.parametrize("words", [(), ("none.score",)])
def test_without_a_screen_it_says_so_and_ends_with_2(words):
    run = compose(*words)
    assert run.returncode == 2
    assert "there is no screen here for a window" in run.stderr
    assert "Traceback" not in run.stderr


def test_its_help_says_what_opens_without_a_score():
    run = compose("--help")
    assert run.returncode == 0
    assert "unsaved copy of Estuary" in " ".join(run.stdout.split())
