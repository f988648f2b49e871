"""The page on playing by hand, held against the code."""

import re
from importlib.resources import files

import pytest

from player.commands.live import command
from player.commands.live_front import HOLD, KEYS
from player.live.screen import KEYS as SHOWN

PAGE = files("player").joinpath("manual", "live.md").read_text()


def test_every_option_of_the_command_is_on_the_page():
    options = {name for parameter in command.params for name in parameter.opts if name.startswith("--")}
    assert {option for option in options if option not in PAGE} == set()


def test_no_option_is_on_the_page_that_the_command_has_not():
    options = {name for parameter in command.params for name in parameter.opts}
    lines = [line for line in PAGE.splitlines() if "drawcord live" in line or line.startswith("| `--")]
    assert {option for line in lines for option in re.findall(r"--[a-z-]+", line)} <= options


@pytest.mark.parametrize("key", [key for key in sorted({*KEYS, HOLD}) if key.isprintable() and key not in " bp"])
def test_every_key_is_on_the_page_and_the_screen(key):
    assert re.search(rf"^\| `{key}`[,| ]", PAGE, re.MULTILINE)
    assert key == HOLD or key in [shown for shown, _ in SHOWN]
