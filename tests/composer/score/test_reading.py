"""Reading a score with the files that it uses."""

from fractions import Fraction
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from composer.faults import Faults, fault
from composer.score.bounds import most
from composer.score.model import Score
from composer.score.reading import parse_score, read_score

HERE = Path(__file__).parent

GOOD = """\
title   "Estuary #1"  # a comment
rig     estuary.rig.toml
meter   4/4
meter   3/4 at 9:1
tempo   72
tempo   96 at 17:1
tempo   96 to 60 from 25:1 to 27:1
group   reeds.low = reed.1-8, reed.12, reed.*
keep    rhythm
pin     17:1 within 0.2s
pin     1:1 every 4bars until 33:1
cue     "doors" at 9:1
cue     "solo" at 21:2+1/2 wait

phrase gather 8
  0      rest
  3      full    smooth
  5      hold    quiver 4Hz by 0.05
  8      rest    settle over 2
phrase flick
\t250ms  12%  sudden
\t2bars  rest curve 10% 8% 3% 1%

section ebb at 1:1 times 2 every 8bars keep clock firm 2
  reeds, hem      gather
  reeds.low       gather  at 5:1  firm 3
  reeds           flick   after 8  canon 1/4 from middle
  reeds           flick   after 24 ripple -0.8 m/s along y
  reeds           gather  times 4 every 8 add
  hem             gather  scale 0.5 stretch 2 retrograde mirror
  hem             gather  scatter 1/8 seed 7
"""


def read(text: str, used: dict[str, str] | None = None) -> Score:
    def read_used(path: str) -> str:
        if path not in (used or {}):
            raise fault(path, "no such file", "", "see that the path is right")
        return used[path]

    return read_score(text, "estuary.score", read_used)


def faults_of(text: str, used: dict[str, str] | None = None) -> list[str]:
    with pytest.raises(Faults) as stop:
        read(text, used)
    return [f"{f.where.file}:{f.where.line}:{f.where.column}: {f.found}" for f in stop.value.faults]


def test_a_score_becomes_its_model():
    score = read(GOOD)
    assert (score.title, score.rig.text, score.keep) == ("Estuary #1", "estuary.rig.toml", "rhythm")
    assert [(m.counts, m.note, m.at and m.at.bar) for m in score.meters] == [(4, 4, None), (3, 4, 9)]
    assert [(t.rate, t.to) for t in score.tempi] == [(72, None), (96, None), (96, 60)]
    assert [m.text for m in score.groups["reeds.low"].members] == ["reed.1-8", "reed.12", "reed.*"]
    assert [(p.at.bar, p.every and p.every.value, p.within and p.within.value) for p in score.pins] == [
        (17, None, Fraction(1, 5)),
        (1, 4, None),
    ]
    assert [(c.name, c.at.count, c.wait) for c in score.cues] == [("doors", 1, False), ("solo", Fraction(5, 2), True)]


def test_a_phrase_becomes_its_lines():
    lines = read(GOOD).phrases["gather"].lines
    assert [(line.offset.value, line.target.value, line.shape) for line in lines] == [
        (0, 0, "smooth"),
        (3, 1, "smooth"),
        (5, 0, "smooth"),
        (8, 0, "settle"),
    ]
    assert (lines[2].target.unit, lines[2].quiver.hertz, lines[2].quiver.by.value) == ("hold", 4, Fraction(1, 20))
    assert lines[3].over.value == 2
    first, second = read(GOOD).phrases["flick"].lines
    assert (first.offset.value, first.offset.unit, first.target.unit, first.shape) == (Fraction(1, 4), "s", "%", "sudden")
    assert (second.offset.unit, [c.value for c in second.controls]) == ("bars", [10, 8, 3, 1])


def test_a_section_becomes_its_entries():
    section = read(GOOD).sections[0]
    assert (section.repeat.times, section.repeat.every.unit, section.keep, section.firm) == (2, "bars", "clock", 2)
    both, placed, canon, ripple, repeat, scaled, scatter = section.entries
    assert [name.text for name in both.fibers] == ["reeds", "hem"]
    assert (placed.at.bar, placed.firm) == (5, 3)
    assert (canon.after.value, canon.canon.delay.value, canon.canon.origin) == (8, Fraction(1, 4), "middle")
    assert (ripple.ripple.speed, ripple.ripple.axis) == (Fraction(-4, 5), 1)
    assert (repeat.repeat.times, repeat.repeat.every.value, repeat.add) == (4, 8, True)
    assert (scaled.scale, scaled.stretch, scaled.retrograde, scaled.mirror) == (Fraction(1, 2), 2, True, True)
    assert (scatter.scatter.within.value, scatter.scatter.seed) == (Fraction(1, 8), 7)


def test_an_empty_score_is_a_score():
    score = read("")
    assert (score.title, score.rig, score.keep, score.phrases, score.sections) == ("", None, "clock", {}, ())


@pytest.mark.parametrize("ending", ["\r\n", "\n"])
def test_line_endings_change_nothing_but_themselves(ending):
    assert read(GOOD.replace("\n", ending)) == read(GOOD)


def test_a_byte_order_mark_is_passed_over():
    assert read("\ufeff" + GOOD).title == "Estuary #1"


def test_every_fault_of_a_spoilt_score_is_told_in_one_pass_as_a_newcomer_would_read_it():
    _, faults = parse_score((HERE / "faults.score").read_text(), "faults.score", lambda path: "")
    assert str(Faults(faults)) + "\n" == (HERE / "faults.txt").read_text()


def test_a_used_file_brings_its_phrases_and_groups_and_nothing_else():
    used = {"phrases/water.score": 'title "Water"\ntempo 100\ngroup low = reed.1\nphrase gather\n  1 full\ncue "x" at 1:1\n'}
    score = read("use phrases/water.score\nsection a at 1:1\n  low gather\n", used)
    assert (list(score.phrases), list(score.groups), score.title, score.tempi, score.cues) == (["gather"], ["low"], "", (), ())
    assert score.phrases["gather"].span.file == "phrases/water.score"


def test_a_used_file_uses_others_relative_to_itself():
    used = {
        "a/b.score": "use c.score\nuse ../d.score\n",
        "a/c.score": "phrase c\n  1 full\n",
        "d.score": "phrase d\n  1 full\n",
    }
    assert set(read("use a/b.score\n", used).phrases) == {"c", "d"}


def test_a_file_used_twice_is_read_once():
    used = {"a.score": "use c.score\n", "b.score": "use ./c.score\n", "c.score": "phrase c\n  1 full\n"}
    assert set(read("use a.score\nuse b.score\n", used).phrases) == {"c"}


def test_files_that_use_one_another_in_a_circle_are_named_in_order():
    used = {"a.score": "use b.score\n", "b.score": "# round\nuse a.score\n"}
    assert faults_of("use a.score\n", used) == [
        "b.score:2:5: these files use one another in a circle: a.score -> b.score -> a.score"
    ]


def test_a_score_that_uses_itself_is_a_circle():
    assert "estuary.score -> estuary.score" in faults_of("use estuary.score\n")[0]


def test_files_lead_no_deeper_than_the_bound():
    used = {f"{n}.score": f"use {n + 1}.score\n" for n in range(most("depth") + 1)}
    assert faults_of("use 0.score\n", used)[0].startswith(
        f"{most('depth') - 1}.score:1:5: 'use' leads more than {most('depth')}"
    )
    used[f"{most('depth') - 1}.score"] = ""
    assert read("use 0.score\n", used)


def test_a_missing_file_is_told_at_its_use_and_its_phrases_are_not_missed():
    assert faults_of("use gone.score\nsection a at 1:1\n  reeds gather\n") == [
        "estuary.score:1:5: cannot use 'gone.score': no such file"
    ]


def test_a_fault_in_a_used_file_names_that_file():
    assert faults_of("use a.score\n", {"a.score": "phrase p\n  1 fulll\n"}) == ["a.score:2:5: unknown word 'fulll'"]


def test_a_phrase_defined_twice_names_both_lines():
    assert faults_of("phrase a\n  1 full\nphrase a\n  1 rest\n") == [
        "estuary.score:3:8: phrase 'a' is defined twice: here and in line 1"
    ]


def test_a_phrase_defined_here_and_in_a_used_file_names_both():
    found = faults_of("use a.score\nphrase a\n  1 full\n", {"a.score": "\nphrase a\n  1 full\n"})
    assert found == ["a.score:2:8: phrase 'a' is defined twice: here and in line 2 of estuary.score"]


@pytest.mark.parametrize("line", ['title "a"', "rig a.toml", "keep clock"])
def test_what_may_stand_once_names_both_lines_where_it_stands_twice(line):
    assert faults_of(f"{line}\n\n{line}\n") == [f"estuary.score:3:1: '{line.split()[0]}' is written twice: here and in line 1"]


def test_a_half_typed_line_leaves_the_rest_of_the_score_readable():
    score, faults = parse_score(GOOD.replace("12%  sudden", "12%  sudd"), "estuary.score")
    assert len(faults) == 1
    assert score.sections == read(GOOD).sections
    assert score.phrases["gather"] == read(GOOD).phrases["gather"]


def test_a_bad_head_puts_no_blame_on_those_who_name_it():
    assert faults_of("phrase gather soon\n  1 full\nsection a at 1:1\n  reeds gather\n") == [
        "estuary.score:1:15: unknown word 'soon'"
    ]


ALPHABET = st.sampled_from(
    [
        *"0123456789.:/+-%#\"'=,*\t \n\r\x00\ufeff\u2028é\U0001f300",
        *("\n  ", "1:1", "250ms", "4Hz", "m/s"),
        *sorted(GOOD.replace("\n", " ").split()),
    ]
)


@settings(max_examples=150, deadline=None)
@given(st.lists(ALPHABET, max_size=60), st.sampled_from(["", " "]))
def test_any_text_gives_a_score_or_faults_in_order(parts, between):
    score, faults = parse_score(between.join(parts), "any.score", lambda path: "")
    assert isinstance(score, Score)
    places = [(f.where.line, f.where.column) for f in faults]
    assert places == sorted(places)
    lines = between.join(parts).split("\n")
    for one in faults:
        assert 0 <= one.where.line <= len(lines)
        assert one.where.column <= len(lines[one.where.line - 1]) + 1
        assert one.found


@settings(max_examples=150, deadline=None)
@given(st.data())
def test_a_good_score_spoilt_anywhere_gives_a_score_or_faults(data):
    text = GOOD
    for _ in range(data.draw(st.integers(1, 4))):
        at = data.draw(st.integers(0, len(text)))
        gone = data.draw(st.integers(0, 8))
        text = text[:at] + data.draw(st.text(max_size=4) | ALPHABET) + text[at + gone :]
    score, faults = parse_score(text, "any.score", lambda path: "")
    assert isinstance(score, Score)
    assert all(one.found and one.where.file for one in faults)


def test_a_rig_given_as_a_score_is_told_in_one_sentence():
    with pytest.raises(Faults) as told:
        read_score('# Estuary\n\n[rig]\nname = "Estuary"\nworn = false\n', "estuary.rig.toml")
    assert str(told.value) == (
        "estuary.rig.toml: its first line is '[rig]', so it is a rig or another file of settings; expected a score"
    )
