"""The operator's page says what the governor does."""

from pathlib import Path

import player
from composer.limits.duration import RESOLUTION
from player.governor import CAUSES, WAYS
from player.governor.governor import LET_DOWN_TO, LONGEST_TICK_S, RECOVERED

PAGE = (Path(player.__file__).parent / "manual" / "governor.md").read_text(encoding="utf-8")


def test_every_cause_has_a_row_under_the_letters_that_are_shown():
    rows = [line for line in PAGE.splitlines() if line.startswith("| `")]
    assert [row.split("`")[1] for row in rows[: len(CAUSES) - 1]] == [cause.shown for cause in CAUSES[1:]]


def test_every_way_of_mixing_has_a_row():
    for way in WAYS[1:]:
        assert f"| `{way}` |" in PAGE


def test_its_numbers_are_those_of_the_code():
    assert f"let down to {LET_DOWN_TO:.0%}".replace("%", " %") in PAGE
    assert f"({LONGEST_TICK_S * 1e3:.0f} ms unless" in PAGE
    assert f"1/{1 / RESOLUTION:.0f} of the stroke" in PAGE
    assert RECOVERED == 0.1 and "a tenth of `duty_burst_s`" in PAGE
