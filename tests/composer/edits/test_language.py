"""Every word of the language has a sentence."""

import pytest

from composer.edits.language import UNITS, word_at
from composer.score.words import KEYWORDS, MANNERS, OPTIONS, STATEMENTS, TARGET_UNITS
from composer.score.words import UNITS as DURATIONS
from composer.shapes import NAMES


@pytest.mark.parametrize("word", sorted(KEYWORDS))
def test_every_word_is_explained_somewhere(word):
    found = word_at(word, "entry", False) or word_at(word, "statement", True) or word_at(word, "move", False)
    assert found is not None
    assert found.says


def test_a_word_means_what_it_does_where_it_stands():
    assert word_at("at", "entry", False) is OPTIONS["at"]
    assert "where" in word_at("at", "statement", False).says
    assert word_at("tempo", "statement", True) is STATEMENTS["tempo"]
    assert word_at("over", "move", False) is MANNERS["over"]
    assert word_at("nothing", "move", False) is None
    assert all(word_at(shape, "move", False) for shape in NAMES)


def test_every_unit_has_its_meaning():
    assert {*DURATIONS, *TARGET_UNITS} - {""} <= set(UNITS)
