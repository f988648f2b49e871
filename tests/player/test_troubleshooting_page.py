"""The page on troubles quotes what the program says, and names what there is."""

import re
from importlib.resources import files
from pathlib import Path

import click
import pytest

from player.commands.gathered import drawcord

ROOT = Path(__file__).parents[2]
TEXT = (ROOT / "player" / "manual" / "troubleshooting.md").read_text(encoding="utf-8")
SOURCE = "\n".join(
    path.read_text(encoding="utf-8") for room in ("composer", "player") for path in Path(str(files(room))).rglob("*.py")
)


@pytest.mark.parametrize("said", sorted(set(re.findall("“([^”]+)”", TEXT)) - {"in quotes"}))
def test_what_is_quoted_is_what_the_program_says(said):
    assert said in SOURCE


def test_every_command_and_option_on_the_page_is_there():
    for name in set(re.findall(r"`drawcord ([a-z]+)", TEXT)):
        assert drawcord.get_command(click.Context(drawcord), name) is not None, name
    options = {one for name in drawcord.list_commands(click.Context(drawcord)) for one in options_of(name)}
    assert set(re.findall(r"`(--[a-z-]+)", TEXT)) - {"--version"} <= options


def options_of(name: str) -> set[str]:
    """The options of a command."""
    command = drawcord.get_command(click.Context(drawcord), name)
    return {one for parameter in command.params for one in parameter.opts}
