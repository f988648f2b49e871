"""What must be true of a whole score."""

from fractions import Fraction

import pytest

from composer.faults import Faults
from composer.rig.select import Selector
from composer.score.bounds import most
from composer.score.checks import Bars
from composer.score.names import groups_of
from composer.score.reading import read_score

PHRASE = "phrase p\n  0 rest\n  2 full\n"


def said(text: str) -> list[str]:
    try:
        read_score(text, "s")
    except Faults as stop:
        return [f"{fault.where.line}:{fault.where.column} {fault.found}" for fault in stop.faults]
    return []


def test_bars_are_counted_through_changes_of_meter():
    score = read_score('meter 3/4 at 3:1\nmeter 5/8 at 5:1\ncue "a" at 6:2\ncue "b" at 3:1\ncue "c" at 2s\n', "s")
    bars = Bars(score.meters)
    assert [bars.in_bar(bar) for bar in (1, 2, 3, 4, 5, 99)] == [4, 4, 3, 3, 5, 5]
    # two bars of 4, two of 3, one of 5, one count
    assert [bars.count_of(cue.at) for cue in score.cues] == [Fraction(8 + 6 + 5 + 1), 8, None]


@pytest.mark.parametrize(
    ("text", "faults"),
    [
        ("meter 4/4\nmeter 3/4", ["2:1 two meters for one bar: here and in line 1"]),
        ("meter 4/4\nmeter 3/4 at 1:1", ["2:1 two meters for one bar: here and in line 1"]),
        ("tempo 60\ntempo 72 at 1:1", ["2:1 two tempi from one place: here and in line 1"]),
        ("tempo 60 at 3s\ntempo 72 at 3s", ["2:1 two tempi from one place: here and in line 1"]),
        ("tempo 60 to 72 from 3:1 to 3:1", ["1:28 the change of tempo ends before it begins"]),
        ("tempo 60 to 72 from 3:1 to 5:1\ntempo 80 at 4:1", ["2:1 this tempo begins within the change of tempo of line 1"]),
        ("tempo 60 to 72 from 3:1 to 5:1\ntempo 80 at 5:1", []),
        ("tempo 60 to 72 from 3:1 to 5:1\ntempo 72 to 60 from 5:1 to 6:1", []),
        ("tempo 60 to 72 from 3:1 to 5:1\ntempo 72 to 60 from 4:4.5 to 6:1",
         ["2:1 this tempo begins within the change of tempo of line 1"]),
        ("tempo 60 at 2:5", ["1:13 bar 2 has 4 counts and no count 5"]),
        ("tempo 60 at 2:4.999", []),
        ("meter 3/4 at 2:1\npin 2:4", ["2:5 bar 2 has 3 counts and no count 4"]),
        ("meter 1/4\npin 2:2+1/2", ["2:5 bar 2 has 1 count and no count 2.5"]),
        ("section s at 1:5", ["1:14 bar 1 has 4 counts and no count 5"]),
        ("pin 5:1 every 1 until 4:1", ["1:23 the pins end before they begin"]),
        ("pin 5:1 every 1 until 5:1", []),
        ("pin 1:1 every 1/1000bars until 200:1", ["1:15 that makes 199000 pins"]),
        ("pin 0s every 1ms until 1000s", ["1:14 that makes 1000000 pins"]),
        ('cue "a" at 1:1\ncue "a" at 2:1', ["2:1 a cue of this name is there already: here and in line 1"]),
        ("phrase p", ["1:1 phrase 'p' has no lines"]),
        ("phrase p\n  2 full\n  2 rest", ["3:3 this line's offset is not after that of line 2"]),
        ("phrase p\n  2 full\n  1s rest", []),
        ("phrase p 3\n  4 full", ["1:10 phrase 'p' is shorter than its last line, at 4 in line 2"]),
        ("phrase p 4\n  4 full", []),
        ("phrase p\n  2 full over 3", ["2:15 this move would begin before the phrase's start"]),
        ("phrase p\n  2 full\n  4 rest over 2+1/4", ["3:15 this move would begin before line 2"]),
        ("phrase p\n  2 full\n  4 rest over 2", []),
        ("phrase p\n  0 full over 1", ["2:15 nothing comes before a line at 0, so it cannot have 'over'"]),
        ("phrase p\n  0 full quiver 2Hz by 0.1", ["2:10 nothing comes before a line at 0, so it cannot have 'quiver'"]),
        ("phrase p\n  0 full curve 0 0 1 1", ["2:10 nothing comes before a line at 0, so it cannot have 'curve'"]),
        ("phrase p\n  0 full step", []),
        (PHRASE + "section s at 1:1\n  a q", ["5:5 no phrase 'q'"]),
        ("phrase p\n  2 full\nsection s at 1:1\n  a p retrograde",
         ["4:7 phrase 'p' has no line at 0, so backwards it has nothing to end on"]),
        (PHRASE + "section s at 1:1\n  a p retrograde", []),
        ("phrase p\n  0 rest\nsection s at 1:1\n  a p times 2", ["4:7 phrase 'p' lasts no time, so its repeats need 'every'"]),
        ("phrase p\n  0 rest\nsection s at 1:1\n  a p times 2 every 1", []),
        ("group a = b\ngroup b = c, a", ["2:14 a group cannot hold itself: a -> b -> a"]),
        ("group a = b, c\ngroup b = d\ngroup c = d\ngroup d = e", []),
    ],
)  # fmt: skip
def test_a_score_is_checked_as_a_whole(text, faults):
    assert said(text) == faults


def test_an_unknown_phrase_is_told_with_the_nearest_or_all_that_there_are():
    def hint(name: str) -> str:
        with pytest.raises(Faults) as stop:
            read_score(f"phrase gather\n  2 full\nphrase flick\n  2 full\nsection s at 1:1\n  a {name}\n", "s")
        return stop.value.faults[0].hint

    assert hint("gathr") == "did you mean 'gather'?"
    assert hint("zz") == "there are gather, flick"


def test_repeats_within_repeats_are_bounded_by_the_moves_that_they_make():
    text = PHRASE + "section s at 1:1 times {} every 8\n  a p times {} every 8\n"
    assert said(text.format(1000, most("moves") // 2000)) == []
    found = said(text.format(1001, most("moves") // 2000))
    assert found == ["5:3 written out, this entry has 4004000 moves for each fiber"]


def test_many_entries_are_bounded_together():
    text = PHRASE + "section s at 1:1 times 10000 every 8\n" + "  a p times 100 every 8\n" * 3
    assert said(text) == ["4:1 written out, this score has more than 4000000 moves"]


@pytest.mark.parametrize("backwards", [False, True])
def test_groups_lie_no_deeper_within_one_another_than_the_bound(make_rig, backwards):
    def chain(count: int) -> str:
        lines = [f"group g{n} = g{n + 1}\n" for n in range(1, count)] + [f"group g{count} = r.1\n"]
        return "".join(reversed(lines) if backwards else lines)

    deep = chain(most("nesting"))
    assert said(deep) == []
    assert Selector(make_rig(1), groups_of(read_score(deep, "s"))).resolve("g1") == (0,)
    assert [one.partition(" ")[2] for one in said(chain(most("nesting") + 1))] == [
        "'g1' holds more than 64 groups within one another"
    ]


def test_a_circle_of_a_thousand_groups_is_told_once_and_in_short():
    text = "".join(f"group g{n} = g{(n + 1) % 1000}\n" for n in range(1000))
    found = [one for one in said(text) if "itself" in one]
    assert found == ["1000:14 a group cannot hold itself: g0 -> g1 -> g2 -> g3 -> … -> g998 -> g999 -> g0"]


def test_where_a_meter_cannot_be_read_no_place_is_judged():
    assert said("meter 5/3\npin 1:5\n") == ["1:7 a note value of 3 is none"]
    assert said("metre 5/4\npin 1:5\n") == ["1:1 unknown word 'metre'"]
