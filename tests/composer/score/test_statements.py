"""The statements that start in column 1."""

from fractions import Fraction

import pytest

from composer.faults import Faults
from composer.score.grammar import parse_line
from composer.score.reading import read_score
from composer.score.statements import BUILDERS
from composer.score.words import STATEMENTS

EVERY_STATEMENT = [
    ("title", 'title "Estuary"', lambda s: s.title, "Estuary"),
    ("rig", "rig rigs/estuary.rig.toml", lambda s: s.rig.text, "rigs/estuary.rig.toml"),
    ("rig", 'rig "my rigs/a.toml"', lambda s: (s.rig.text, s.rig.span.column), ("my rigs/a.toml", 6)),
    ("meter", "meter 7/8", lambda s: (s.meters[0].counts, s.meters[0].note, s.meters[0].at), (7, 8, None)),
    ("meter", "meter 3/4 at 9:1", lambda s: s.meters[0].at.bar, 9),
    ("tempo", "tempo 72.5", lambda s: (s.tempi[0].rate, s.tempi[0].at), (Fraction(145, 2), None)),
    ("tempo", "tempo 96 at 17:3", lambda s: (s.tempi[0].at.bar, s.tempi[0].at.count), (17, 3)),
    ("tempo", "tempo 96 at 12s", lambda s: s.tempi[0].at.seconds, 12),
    ("tempo to", "tempo 96 to 60 from 25:1 to 27:1", lambda s: (s.tempi[0].to, s.tempi[0].until.bar), (60, 27)),
    ("group", "group a.b = c, d-1, e.*, *", lambda s: [m.text for m in s.groups["a.b"].members], ["c", "d-1", "e.*", "*"]),
    ("keep", "keep clock", lambda s: s.keep, "clock"),
    ("keep", "keep rhythm", lambda s: s.keep, "rhythm"),
    ("pin", "pin 3:1", lambda s: (s.pins[0].at.bar, s.pins[0].every, s.pins[0].until, s.pins[0].within), (3, None, None, None)),
    ("pin", "pin 3:1 every 4bars until 9:1", lambda s: (s.pins[0].every.value, s.pins[0].until.bar), (4, 9)),
    ("pin", "pin 3:1 within 200ms", lambda s: s.pins[0].within.value, Fraction(1, 5)),
    ("pin", "pin 1:1 every 2 until 9:1 within 1/8",
     lambda s: (s.pins[0].every.value, s.pins[0].within.value), (2, Fraction(1, 8))),
    ("cue", 'cue "the doors" at 9:1', lambda s: (s.cues[0].name, s.cues[0].wait, s.cues[0].at.bar), ("the doors", False, 9)),
    ("cue", 'cue "solo" at 9:1 wait', lambda s: s.cues[0].wait, True),
    ("phrase", "phrase p 8\n  1 full", lambda s: s.phrases["p"].length.value, 8),
    ("phrase", "phrase p\n  1 full", lambda s: s.phrases["p"].length, None),
    ("section", "section s at 2:1", lambda s: (s.sections[0].name, s.sections[0].at.bar, s.sections[0].keep), ("s", 2, "")),
    ("section", "section s at 2:1 times 3 every 8", lambda s: s.sections[0].repeat.every.value, 8),
    ("section", "section s at 2:1 keep rhythm firm 2", lambda s: (s.sections[0].keep, s.sections[0].firm), ("rhythm", 2)),
    ("section", "section s at 2:1 firm 2 times 3 every 8", lambda s: (s.sections[0].repeat.times, s.sections[0].firm), (3, 2)),
    ("use", "use a.score", lambda s: list(s.lines), ["main.score", "a.score"]),
]  # fmt: skip


@pytest.mark.parametrize(("name", "text", "part", "value"), EVERY_STATEMENT)
def test_a_statement_becomes_its_part_of_the_score(name, text, part, value):
    assert part(read_score(text, "main.score", lambda path: "")) == value


def test_the_table_of_statements_is_tested_whole():
    assert {row[0] for row in EVERY_STATEMENT} == set(STATEMENTS)


def test_every_rule_of_the_grammar_has_a_builder():
    assert {str(parse_line("statement", row[1].split("\n")[0]).data) for row in EVERY_STATEMENT} == set(BUILDERS)


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("tempo 0", "'0' is out of range"),
        ("tempo -60", "'-60' is negative"),
        ("tempo 1001", "'1001' is out of range"),
        ("tempo 60 to 0 from 1:1 to 2:1", "'0' is out of range"),
        ("meter 0/4", "'0' is out of range"),
        ("meter 65/4", "'65' is out of range"),
        ("meter 4/3", "a note value of 3 is none"),
        ("meter 4/128", "'128' is out of range"),
        ("meter -4/4", "'-4' is negative"),
        ("meter 3/4 at 9:2", "a meter begins at the first count of a bar, not at count 2"),
        ("meter 3/4 at 9s", "a meter begins at a bar, not at a number of seconds"),
        ("pin 1:1 every -1 until 2:1", "'-1' is negative"),
        ("pin 1:1 within -1", "'-1' is negative"),
        ('title " "', "the text after 'title' is empty"),
        ('cue "" at 1:1', "the text after 'cue' is empty"),
        ("phrase p 0\n  0 rest", "'0' is out of range"),
        ("section s at 1:1 times 2", "a section's repeats need the time between them"),
        ("section s at 1:1 keep clock keep rhythm", "keep is written twice"),
        ("section s at 200000:1", "'200000' is out of range"),
    ],
)
def test_a_statement_out_of_range_says_so(text, found):
    with pytest.raises(Faults) as stop:
        read_score(text, "main.score")
    assert [fault.found for fault in stop.value.faults] == [found]
