"""The page on takes says what the code does."""

from pathlib import Path

import click
import pytest

import player
from player.commands.take import command
from player.takes.file import MOST_BYTES
from player.takes.form import END, HEAD, INPUT, MAGIC, MOST_FIBERS, MOST_SAMPLES, SAMPLE


@pytest.fixture(scope="module")
def page():
    return (Path(player.__file__).parent / "manual" / "takes.md").read_text(encoding="utf-8")


def test_every_kind_of_record_and_every_bound_is_told(page):
    for number, name in ((HEAD, "head"), (INPUT, "input"), (SAMPLE, "sample"), (END, "end")):
        assert f"| {number} {name} |" in page
    assert b"drawctak" + bytes([1, 0]) == MAGIC and "`drawctak`, 1, 0" in page
    assert f"{MOST_FIBERS:,}".replace(",", " ") in page and f"{MOST_SAMPLES:,}".replace(",", " ") in page
    assert MOST_BYTES == 1 << 30 and "1 GiB" in page


def test_every_option_that_changes_the_score_is_told(page):
    options = {option.opts[0] for option in command.params if isinstance(option, click.Option)}
    assert options - {"--json", "--rig", "--title"} <= set(page.replace("`", " ").split()) | {"-o"}
