"""The operator's page says what the code does."""

from pathlib import Path

import pytest

import player
from player.commands.front import KEYS
from player.engine.holds import LET_DOWN_TO
from player.engine.loop import AHEAD_S
from player.engine.run_log import KINDS
from player.engine.safety import DEEDS, EVENTS, FAULTS, STATES, TABLE
from player.outputs.board import WATCHDOG_MS
from player.outputs.targets import SCHEMES


@pytest.fixture(scope="module")
def page():
    return (Path(player.__file__).parent / "manual" / "playing.md").read_text(encoding="utf-8")


def test_every_transition_is_in_the_page_and_no_other(page):
    said = [line for line in page.splitlines() if line.count("|") == 5 and line.split("|")[1].strip() in STATES]
    assert said == [f"| {row.state} | {row.event} | {row.next} | {', '.join(row.must) or '–'} |" for row in TABLE]


def test_states_events_and_deeds_are_told_as_the_table_has_them(page):
    for name, says in [*STATES.items(), *EVENTS.items(), *DEEDS.items()]:
        assert f"| {name} | {says} |" in page


def test_every_fault_and_every_target_is_told(page):
    for code, (name, _, sentence, look) in FAULTS.items():
        row = next(line for line in page.splitlines() if line.startswith(f"| {code} {name} |"))
        assert row.startswith(f"| {code} {name} | {sentence} |") and row.endswith(f"| {look} |")
    for scheme in SCHEMES.values():
        assert f"| `{scheme.written}` | {scheme.says} |" in page


def test_every_kind_of_record_is_told(page):
    for number, name in KINDS.items():
        assert f"| {number} {name} |" in page


def test_the_numbers_that_it_gives_are_those_of_the_code(page):
    assert f"sent {AHEAD_S * 1000:.0f} ms before" in page
    assert f"nothing for {WATCHDOG_MS} ms vents" in page
    assert f"to {LET_DOWN_TO:.0%}".replace("%", " %") in page


def test_every_key_that_asks_something_is_told(page):
    table = page[page.index("| key | does |") : page.index("**A pause holds.**")]
    spelt = {"\n": "Return", "\r": "Return", " ": "space", "\x1b": "Escape"}
    for key in KEYS:
        assert spelt.get(key, f"`{key}`") in table


def test_the_cautions_stand_where_they_are_needed(page):
    for words in ("no safety device", "hard-wired", "pressure relief", "local codes and a qualified person"):
        assert words in " ".join(page.replace(">", " ").split())
