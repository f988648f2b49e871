from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from composer.rig.select import Selector
from player.inputs.map_file import read_map
from player.inputs.model import Bind, Control, Does, Play, Stroke
from player.inputs.schema import MOST_BINDS


def faults_of(map_of, text):
    with pytest.raises(Faults) as caught:
        map_of(text)
    return str(caught.value)


def test_every_kind_of_control_is_read(map_of):
    written = ("cc = 21", "cc14 = 3", "note = 36", "bend = true", "pressure = true", "poly_pressure = 60")
    text = "".join(f'[[bind]]\nmidi = {{ {one}, channel = 2, port = "box" }}\nfibers = "r.*"\n' for one in written)
    assert [bind.control for bind in map_of(text).binds] == [
        Control(kind, number, 2, "box")
        for kind, number in (("cc", 21), ("cc14", 3), ("note", 36), ("bend", 0), ("pressure", 0), ("poly_pressure", 60))
    ]


def test_a_bind_of_each_form_is_read_with_its_line(map_of):
    text = """
[[bind]]
midi = { cc = 1 }
fibers = "low, r.4"
as = "stroke"
low = 0.1
high = 0.8
curve = "gentle"
pickup = true
how = "adds"
[[bind]]
midi = { note = 36 }
phrase = "flick"
on = "r.1-3"
release = "rest"
quantise = "1/2"
[[bind]]
osc = "/stop"
does = "vent"
"""
    assert map_of(text).binds == (
        Bind(Control("cc", 1), "", Stroke((0, 1, 3), 0.1, 0.8, "gentle", True, "adds"), 4),
        Bind(Control("note", 36), "", Play("flick", (0, 1, 2), True, Fraction(1, 2)), 13),
        Bind(None, "/stop", Does("vent"), 19),
    )


@pytest.mark.parametrize(
    ("written", "counts"), [("1", 1), ("0.5", Fraction(1, 2)), ("3/4", Fraction(3, 4)), ("1+1/2", Fraction(3, 2))]
)
def test_a_quantised_start_is_written_as_counts_are_in_a_score(map_of, written, counts):
    text = f'[[bind]]\nmidi = {{ note = 1 }}\nphrase = "flick"\non = "r.1"\nquantise = "{written}"\n'
    assert map_of(text).binds[0].deed.quantise == counts


WRONG = [
    ('[[bind]]\nmidi = { cc = 120 }\nfibers = "r.1"', "hand.map.toml:4:15: cc is 120; expected a whole number from 0 to 119"),
    ('[[bind]]\nmidi = { cc = 1, channel = 17 }\nfibers = "r.1"', "hand.map.toml:4:28: channel is 17"),
    ('[[bind]]\nmidi = { channel = 1 }\nfibers = "r.1"', "hand.map.toml:4:8: midi names no control"),
    ('[[bind]]\nmidi = { cc = 1, note = 2 }\nfibers = "r.1"', "midi has 'cc', 'note' at once; expected one of"),
    ('[[bind]]\nmidi = { cc14 = 32 }\nfibers = "r.1"', "cc14 is 32; expected a whole number from 0 to 31"),
    ('[[bind]]\nmidi = { bend = false }\nfibers = "r.1"', "hand.map.toml:4:17: bend is false; expected true"),
    ('[[bind]]\nmidi = { chanel = 1, cc = 1 }\nfibers = "r.1"', "did you mean 'channel'?"),
    ('[[bind]]\nmdi = { cc = 1 }\nfibers = "r.1"', "did you mean 'midi'?"),
    ('[[bind]]\nmidi = 21\nfibers = "r.1"', "midi is 21; expected a table such as { cc = 21, channel = 1 }"),
    ('[[bind]]\nfibers = "r.1"', "hand.map.toml:3:1: a bind has neither midi nor osc"),
    ('[[bind]]\nmidi = { cc = 1 }\nosc = "/a"\nfibers = "r.1"', "hand.map.toml:5:1: a bind has both midi and osc"),
    ("[[bind]]\nmidi = { cc = 1 }", "hand.map.toml:3:1: a bind does nothing; expected fibers, phrase or does"),
    ('[[bind]]\nmidi = { cc = 1 }\nfibers = "r.1"\ndoes = "vent"', "a bind has 'fibers', 'does' at once"),
    ('[[bind]]\nmidi = { cc = 1 }\nfibers = "r.9"', "hand.map.toml:5:10: no fiber or group 'r.9' in the rig"),
    ('[[bind]]\nmidi = { cc = 1 }\nfibers = "lwo"', "did you mean 'low'?"),
    ('[[bind]]\nmidi = { cc = 1 }\nfibers = "r.1,"', "a name is missing beside a comma"),
    ('[[bind]]\nmidi = { cc = 1 }\nfibers = "r.1"\nhigh = 1.2', "high is 1.2; expected a number from 0 to 1"),
    ('[[bind]]\nmidi = { cc = 1 }\nfibers = "r.1"\ncurve = "steap"', "did you mean 'steep'?"),
    (
        '[[bind]]\nmidi = { cc = 1 }\nfibers = "r.1"\non = "r.1"',
        "hand.map.toml:6:1: 'on' means nothing in a bind with 'fibers'",
    ),
    ('[[bind]]\nmidi = { cc = 1 }\nphrase = "flik"\non = "r.1"', "hand.map.toml:5:10: no phrase 'flik' in the score"),
    ('[[bind]]\nmidi = { cc = 1 }\nphrase = "flick"', "no 'on' beside the phrase 'flick'"),
    ('[[bind]]\nmidi = { note = 1 }\nphrase = "flick"\non = "r.1"\nquantise = "0"', 'quantise is "0"; expected counts above 0'),
    ('[[bind]]\nmidi = { note = 1 }\nphrase = "flick"\non = "r.1"\nquantise = "1/0"', 'quantise is "1/0"'),
    ('[[bind]]\nmidi = { note = 1 }\ndoes = "vnt"', "did you mean 'vent'?"),
    ('[[bind]]\nmidi = { note = 1 }\ndoes = "arm"', 'does is "arm"'),
    ('[[bind]]\nosc = "reeds"\ndoes = "vent"', "expected an address that begins with '/'"),
    ('[[bind]]\nosc = "/a/*"\ndoes = "vent"', "expected an address that begins with '/'"),
    ('[[bind]]\nosc = "/drawcord/vent"\ndoes = "vent"', "an address outside '/drawcord/'"),
    ('[[bind]]\nosc = "/foot"\ndoes = "hold_to_run"', "hold_to_run over OSC; expected a MIDI control"),
    ("[bind]\nmidi = { cc = 1 }", "write [[bind]], with two brackets"),
    ("bind = 3", "no key 'bind' in [source]"),
    ("[sauce]", "no table 'sauce' in a map file"),
    ('[[bind]]\nmidi = { cc = 1\nfibers = "r.1"', "hand.map.toml:4"),
]


@pytest.mark.parametrize(("text", "said"), WRONG, ids=[said for _, said in WRONG])
def test_what_is_wrong_is_told_where_it_stands(map_of, text, said):
    assert said in faults_of(map_of, text + "\n")


def test_all_that_is_wrong_is_told_at_once_in_the_order_of_the_lines(map_of):
    text = '[[bind]]\nmidi = { cc = 200 }\nfibers = "r.9"\n[[bind]]\nosc = "x"\ndoes = "jump"\n'
    said = [line.split(":")[1] for line in faults_of(map_of, text).splitlines() if line.startswith("hand.map.toml:")]
    assert said == ["4", "5", "8"]


def test_a_phrase_without_a_score_says_what_to_do(make_rig):
    with pytest.raises(Faults, match="play the score instead of the rig alone"):
        read_map('[[bind]]\nmidi = { cc = 1 }\nphrase = "flick"\non = "r.1"\n', "m", Selector(make_rig(4), {}), ())


def test_more_binds_than_allowed_are_refused(map_of):
    text = '[[bind]]\nmidi = { cc = 1 }\ndoes = "rest"\n' * (MOST_BINDS + 1)
    assert f"the map has {MOST_BINDS + 1} binds; expected at most {MOST_BINDS}" in faults_of(map_of, text)


@given(st.text(alphabet='[]{}=",.#\n midcosrbenf/_01', max_size=80))
def test_whatever_is_written_ends_in_a_map_or_in_faults(make_rig, text):
    try:
        read_map(text, "m", Selector(make_rig(4), {}), ())
    except Faults as wrong:
        assert str(wrong).startswith("m")
