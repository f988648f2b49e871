"""Lines of phrases and entries of sections."""

from fractions import Fraction

import pytest

from composer.faults import Faults
from composer.score.model import Entry, Line
from composer.score.reading import read_score
from composer.score.spans import span_of
from composer.score.words import MANNERS, OPTIONS
from composer.shapes import NAMES


def entry(options: str) -> Entry:
    return read_score(f"phrase p 4\n  0 rest\n  2 full\nsection s at 1:1\n  a p {options}\n", "s").sections[0].entries[0]


def line(text: str) -> Line:
    return read_score(f"phrase p\n  {text}\n", "s").phrases["p"].lines[0]


def said(text: str) -> list[str]:
    with pytest.raises(Faults) as stop:
        read_score(text, "s")
    return [fault.found for fault in stop.value.faults]


NEUTRAL = {
    "at": None, "after": None, "repeat": None, "canon": None, "ripple": None, "scale": 1, "stretch": 1,
    "retrograde": False, "mirror": False, "scatter": None, "add": False, "firm": 1,
}  # fmt: skip

EVERY_OPTION = [
    ("at", "at 5:2+1/2", "at", lambda v: (v.bar, v.count), (5, Fraction(5, 2))),
    ("at", "at 12.4s", "at", lambda v: (v.bar, v.seconds), (0, Fraction(62, 5))),
    ("after", "after 250ms", "after", lambda v: (v.value, v.unit), (Fraction(1, 4), "s")),
    ("times", "times 3", "repeat", lambda v: (v.times, v.every), (3, None)),
    ("times", "times 3 every 2bars", "repeat", lambda v: (v.times, v.every.value, v.every.unit), (3, 2, "bars")),
    ("canon", "canon 1/4", "canon", lambda v: (v.delay.value, v.origin), (Fraction(1, 4), "start")),
    ("canon", "canon 1 from end", "canon", lambda v: v.origin, "end"),
    ("canon", "canon 1 from middle", "canon", lambda v: v.origin, "middle"),
    ("canon", "canon 1 from edges", "canon", lambda v: v.origin, "edges"),
    ("ripple", "ripple 0.8 m/s along x", "ripple", lambda v: (v.speed, v.axis), (Fraction(4, 5), 0)),
    ("ripple", "ripple -2m/s along z", "ripple", lambda v: (v.speed, v.axis), (-2, 2)),
    ("scale", "scale 3/4", "scale", lambda v: v, Fraction(3, 4)),
    ("stretch", "stretch 2", "stretch", lambda v: v, 2),
    ("retrograde", "retrograde", "retrograde", lambda v: v, True),
    ("mirror", "mirror", "mirror", lambda v: v, True),
    ("scatter", "scatter 1/8 seed 7", "scatter", lambda v: (v.within.value, v.seed), (Fraction(1, 8), 7)),
    ("add", "add", "add", lambda v: v, True),
    ("firm", "firm 5", "firm", lambda v: v, 5),
]


@pytest.mark.parametrize(("word", "text", "field", "part", "value"), EVERY_OPTION)
def test_an_option_sets_its_field_and_no_other(word, text, field, part, value):
    made = entry(text)
    assert part(getattr(made, field)) == value
    assert {name: getattr(made, name) for name in NEUTRAL if name != field} == {
        name: neutral for name, neutral in NEUTRAL.items() if name != field
    }
    assert span_of(made, word).column == 7


def test_the_table_of_options_is_tested_whole():
    assert {row[0] for row in EVERY_OPTION} == set(OPTIONS)


def test_options_come_in_any_order():
    forward, backward = entry("scale 2 add canon 1 after 3"), entry("after 3 canon 1 add scale 2")
    for name in NEUTRAL:
        one, other = getattr(forward, name), getattr(backward, name)
        assert getattr(one, "value", one) == getattr(other, "value", other) or name == "canon"
    assert forward.canon.delay.value == backward.canon.delay.value


@pytest.mark.parametrize("word", sorted({row[0] for row in EVERY_OPTION}))
def test_an_option_stands_once(word):
    text = next(row[1] for row in EVERY_OPTION if row[0] == word)
    assert said(f"phrase p\n  0 rest\n  2 full\nsection s at 1:1\n  a p {text} {text}\n") == [f"{word} is written twice"]


@pytest.mark.parametrize("shape", [name for name in NAMES if name != "curve"])
def test_a_line_takes_every_shape(shape):
    made = line(f"3 full {shape}")
    assert (made.shape, made.controls) == (shape, ())
    assert span_of(made, "shape").column == 10


def test_a_line_without_a_shape_is_smooth():
    assert line("3 full").shape == "smooth"


def test_a_curve_has_four_control_values_of_any_unit_and_sign():
    made = line("3 full curve hold -2% 8mm full")
    assert made.shape == "curve"
    assert [(c.value, c.unit) for c in made.controls] == [(0, "hold"), (-2, "%"), (8, "mm"), (1, "stroke")]


EVERY_MANNER = [
    ("over", "over 2", lambda made: (made.over.value, made.over.unit), (2, "counts")),
    ("quiver", "quiver 4Hz by 1mm", lambda made: (made.quiver.hertz, made.quiver.by.unit), (4, "mm")),
    ("quiver", "quiver 2.5 Hz by 5%", lambda made: (made.quiver.hertz, made.quiver.by.value), (Fraction(5, 2), 5)),
]


@pytest.mark.parametrize(("word", "text", "part", "value"), EVERY_MANNER)
def test_a_line_takes_what_stands_beside_its_shape_on_either_side(word, text, part, value):
    assert part(line(f"3 full settle {text}")) == part(line(f"3 full {text} settle")) == value


def test_the_table_of_manners_is_tested_whole():
    assert {row[0] for row in EVERY_MANNER} == set(MANNERS)


@pytest.mark.parametrize(
    ("text", "value", "unit"),
    [("0.6", "3/5", "stroke"), ("12%", "12", "%"), ("8mm", "8", "mm"), ("90deg", "90", "deg"), ("rest", "0", "stroke"),
     ("full", "1", "stroke"), ("hold", "0", "hold"), ("3/4", "3/4", "stroke"), ("1.5", "3/2", "stroke")],
)  # fmt: skip
def test_a_target_has_its_value_and_unit(text, value, unit):
    made = line(f"3 {text}").target
    assert (made.value, made.unit, made.span.column, made.span.end) == (Fraction(value), unit, 5, 5 + len(text))


@pytest.mark.parametrize(
    ("text", "found"),
    [
        ("-1 full", "'-1' is negative"),
        ("3 -0.1", "'-0.1' is negative"),
        ("3 full over 0", "'0' is out of range"),
        ("3 full over -1", "'-1' is negative"),
        ("3 full quiver 200Hz by 0.1", "'200Hz' is out of range"),
        ("3 full quiver 4Hz by hold", "a quiver needs an amplitude of its own"),
        ("3 full quiver 4Hz by 0", "'0' is out of range"),
        ("3 full step over 1", "a step takes no time, so 'over' means nothing here"),
        ("3 full smooth linear", "shape is written twice"),
        ("9999999s full", "'9999999s' is out of range"),
    ],
)
def test_a_line_out_of_range_says_so(text, found):
    assert said(f"phrase p\n  {text}\n") == [found]


@pytest.mark.parametrize(
    ("options", "found"),
    [
        ("at 0:1", "'0' is out of range"),
        ("at 1:0", "'0' is out of range"),
        ("at -1:1", "'-1' is negative"),
        ("at -3s", "'-3s' is negative"),
        ("after -1", "'-1' is negative"),
        ("times 0", "'0' is out of range"),
        ("times -1", "'-1' is negative"),
        ("times 1000000000", "'1000000000' is out of range"),
        ("times 2 every 0", "'0' is out of range"),
        ("canon -1", "'-1' is negative"),
        ("ripple 0 m/s along x", "'0 m/s' is out of range"),
        ("scale -1", "'-1' is negative"),
        ("stretch 0", "'0' is out of range"),
        ("scatter -1 seed 1", "'-1' is negative"),
        ("scatter 1 seed -1", "'-1' is negative"),
        ("scatter 1 seed 4294967296", "'4294967296' is out of range"),
        ("firm 0", "'0' is out of range"),
        ("at 1:1 after 2", "an entry starts either 'at' a place or 'after' a while, not both"),
    ],
)
def test_an_option_out_of_range_says_so(options, found):
    assert said(f"phrase p\n  1 full\nsection s at 1:1\n  a p {options}\n") == [found]


@pytest.mark.parametrize("axis", "xyz")
def test_a_ripple_runs_along_every_axis(axis):
    assert entry(f"ripple 1 m/s along {axis}").ripple.axis == "xyz".index(axis)
