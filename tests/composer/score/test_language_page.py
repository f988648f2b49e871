"""The manual's page on the language says what the reader does."""

import re
from importlib.resources import files

import pytest

from composer.faults import Faults
from composer.score.reading import read_score
from composer.score.tables import tables
from composer.score.words import KEYWORDS, MANNERS, OPTIONS, STATEMENTS
from composer.shapes import NAMES, SAYS

PAGE = files("composer").joinpath("manual/language.md").read_text(encoding="utf-8")


def blocks(kind: str) -> list[str]:
    return re.findall(rf"^```{kind}\n(.*?)^```$", PAGE, re.MULTILINE | re.DOTALL)


@pytest.mark.parametrize("name", sorted(tables()))
def test_each_table_of_the_page_is_the_readers_own(name):
    assert tables()[name] in PAGE


@pytest.mark.parametrize("example", blocks("score"))
def test_every_example_of_the_page_can_be_read(example):
    assert read_score(example, "example.score").lines


def test_the_page_has_its_examples():
    assert len(blocks("score")) == 4


def test_every_wrong_example_gets_the_message_that_stands_below_it():
    for example, message in zip(blocks("wrong"), blocks("message"), strict=True):
        with pytest.raises(Faults) as stop:
            read_score(example, "gather.score")
        assert str(stop.value) + "\n" == message


@pytest.mark.parametrize("word", sorted(KEYWORDS))
def test_every_word_of_the_language_stands_in_the_page_and_in_an_example_or_a_table(word):
    assert re.search(rf"(?<![\w.-]){word}(?![\w-])", "".join(blocks("score")) + "".join(tables().values()))


def test_every_shape_is_told():
    assert tuple(SAYS) == NAMES


@pytest.mark.parametrize("word", [*STATEMENTS.values(), *OPTIONS.values(), *MANNERS.values()], ids=lambda word: word.form)
def test_every_form_opens_with_its_own_word(word):
    assert word.form.split()[0] == word.name.split()[0]
