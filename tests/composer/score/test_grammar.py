"""One line through the grammar."""

import re

import pytest
from lark import Tree

from composer.score.grammar import STARTS, Misfit, _grammar, body_of, parse_line, tell
from composer.score.words import KEYWORDS, OPTIONS, SAMPLES


def terminals() -> dict[str, str]:
    return {terminal.name: terminal.pattern.value for terminal in _grammar().terminals}


def test_every_word_of_the_language_is_a_word_of_the_grammar_and_no_other():
    words = {name.lower() for name, pattern in terminals().items() if pattern.startswith(name.lower() + "(?!")}
    assert words == KEYWORDS


def test_every_other_token_has_words_for_the_reader():
    others = {name for name in terminals() if name.lower() not in KEYWORDS and not name.startswith("__")}
    assert others <= set(SAMPLES)


def test_no_phrase_can_have_the_name_of_an_option():
    pattern = terminals()["PHRASE_NAME"]
    assert {name for name in OPTIONS if re.match(pattern, name)} == set()
    assert all(re.fullmatch(pattern, name + "s") for name in OPTIONS)


@pytest.mark.parametrize("word", sorted({"swell", "step", "full", "keep", "title", "x"}))
def test_other_words_of_the_language_may_be_names(word):
    assert isinstance(parse_line("statement", f"phrase {word}"), Tree)
    assert isinstance(parse_line("entry", f"  {word} {word}"), Tree)


@pytest.mark.parametrize(
    ("start", "body", "column", "width", "found"),
    [
        ("statement", "titel", 1, 5, "unknown word 'titel'"),
        ("statement", "tempo", 6, 1, "the line ends here"),
        ("statement", "tempo fast", 7, 4, "unknown word 'fast'"),
        ("statement", "cue doors at 1:1", 5, 5, "unknown word 'doors'"),
        ("statement", "meter 4/4 5:1", 11, 3, "'5:1' cannot stand here"),
        ("statement", "phrase at 3", 8, 2, "'at' cannot stand here"),
        ("statement", "group 7reeds = a", 7, 6, "'7reeds' cannot stand here"),
        ("statement", "keep time", 6, 4, "unknown word 'time'"),
        ("move", "  3sec full", 3, 4, "'3sec' cannot stand here"),
        ("move", "  3 fulll", 5, 5, "unknown word 'fulll'"),
        ("move", "  3 full over", 14, 1, "the line ends here"),
        ("move", "  inf full", 3, 3, "unknown word 'inf'"),
        ("move", "  1e3 full", 3, 3, "'1e3' cannot stand here"),
        ("move", "  3 \x00", 5, 1, "character U+0000 cannot stand in a score"),
        ("entry", "  reeds/2 flick", 3, 7, "unknown word 'reeds/2'"),
        ("entry", "  reeds flick times 2.5", 21, 3, "'2.5' cannot stand here"),
        ("entry", "  reeds flick ripple 2 along x", 22, 1, "'2' cannot stand here"),
    ],
)
def test_a_misfit_is_found_whole_at_its_column(start, body, column, width, found):
    misfit = parse_line(start, body)
    assert isinstance(misfit, Misfit)
    assert (misfit.column, misfit.width, misfit.found) == (column, width, found)


@pytest.mark.parametrize(
    ("start", "body", "hint"),
    [
        ("statement", "secton a at 1:1", "did you mean 'section'?"),
        ("statement", "Title", "write 'title' in small letters"),
        ("move", "  3 rset", "did you mean 'rest'?"),
        ("move", "  3 full setle", "did you mean 'settle'?"),
        ("move", "  3 full qiver 2Hz by 0.1", "did you mean 'quiver'?"),
        ("move", "  .5 full", "write 0.5"),
        ("move", "  0,5 full", "write a point, not a comma, in a decimal"),
        ("move", "  3 −0.5", "write a plain minus: -"),
        ("entry", "  reeds flick cannon 2", "did you mean 'canon'?"),
        ("entry", "  reeds flick canon 2 from midle", "did you mean 'middle'?"),
        ("statement", "title “x”", 'write straight quotes: "'),
        ("statement", 'title "x', "the quotes are not closed"),
        ("entry", "  reeds flick times 3 every 3 bars", "write number and unit together: 3bars"),
        ("entry", "  reeds flick after 1.5 s", "write number and unit together: 1.5s"),
        ("move", "  2 70 %", "write number and unit together: 70%"),
        ("move", "  2 240 mm smooth", "write number and unit together: 240mm"),
        ("entry", "  reeds flick scale 2 %", ""),
    ],
)
def test_a_misfit_comes_with_what_to_do(start, body, hint):
    assert parse_line(start, body).hint == hint


@pytest.mark.parametrize("start", STARTS)
def test_no_message_speaks_in_the_names_of_the_grammar(start):
    for body in ("", "?", "  reeds ?", "  3 ?", "  3 full over ?", "cue ?", "pin 1:1 ?", "  a b times ?"):
        misfit = parse_line(start, body)
        assert not re.search(r"[A-Z]{2}|_[A-Z]|\$", misfit.expected.replace("1.5s", "")), misfit


def test_words_that_all_could_stand_are_told_as_one_family():
    assert tell({name.upper() for name in OPTIONS} | {"$END"}).startswith("an option (at, after, ")


@pytest.mark.parametrize(
    ("text", "body"),
    [
        ("tempo 72  # brisk", "tempo 72"),
        ('title "no. #1"  # one', 'title "no. #1"'),
        ("# all", ""),
        ('cue "a#b" at 1:1#c', 'cue "a#b" at 1:1'),
        ("\t ", ""),
    ],
)
def test_a_comment_ends_the_line_but_not_within_quotes(text, body):
    assert body_of(text) == body


def test_a_line_is_parsed_once_however_often_it_is_read():
    body = "  3.25 full smooth over 1.125"
    assert parse_line("move", body) is parse_line("move", body)
