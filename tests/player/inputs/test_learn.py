import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from player.inputs.learn import Learner, learned
from player.inputs.model import NO_MAP, Control


def first(bytes_of, text):
    learner = Learner()
    return next((control for message in bytes_of(text) if (control := learner.hear(message)) is not None), None)


@pytest.mark.parametrize(
    ("text", "control"),
    [
        ("B21501 B21502 B21503", Control("cc", 21, 3)),
        ("903C40", Control("note", 60, 1)),
        ("E00041 E00042 E00043", Control("bend", 0, 1)),
        ("D001 D002 D003", Control("pressure", 0, 1)),
        ("A03C01 A03C02 A03C03", Control("poly_pressure", 60, 1)),
        ("B00340 B02301 B02305 B00341 B02309", Control("cc14", 3, 1)),
        ("B02301 B00340 B02305 B00341 B02309 B00342", Control("cc14", 3, 1)),
    ],
)
def test_the_control_that_is_plainly_moved_is_learnt(bytes_of, text, control):
    assert first(bytes_of, text) == control


@pytest.mark.parametrize(
    "text", ["F8 F8 F8 FE FE FE", "B01501 B01502 B01501 B01502", "803C00 903C00", "B07B00 B07B01 B07B02", "C001 C002"]
)
def test_clocks_noise_releases_and_mode_messages_are_no_controls(bytes_of, text):
    assert first(bytes_of, text) is None


def test_a_bind_is_added_at_the_end_and_all_else_stays(map_of):
    text = '# mine   \n[source]\nsilence_s = 0   # never\n\n[[bind]]\nmidi = {cc=1}  # left\nfibers="r.1"'
    longer = learned(text, NO_MAP, Control("cc", 21, 1), 'fibers = "r.2"\npickup = true')
    assert longer == text + '\n\n[[bind]]\nmidi = { cc = 21, channel = 1 }\nfibers = "r.2"\npickup = true\n'


def test_line_ends_stay_what_they_were():
    text = "[source]\r\nsilence_s = 0\r\n"
    assert learned(text, NO_MAP, Control("note", 3, 1), 'fibers = "r"').count("\r\n") == 6


def test_a_new_map_begins_with_the_bind():
    assert (
        learned("", NO_MAP, Control("bend", 0, 2), 'does = "rest"')
        == '[[bind]]\nmidi = { bend = true, channel = 2 }\ndoes = "rest"\n'
    )


@pytest.mark.parametrize(
    ("midi", "bound"),
    [("cc = 21", True), ("cc = 21, channel = 1", True), ("cc = 21, channel = 2", False), ("note = 21", False)],
)
def test_a_control_that_is_bound_already_is_told_at_its_line(map_of, midi, bound):
    text = f'[[bind]]\nmidi = {{ {midi} }}\nfibers = "r.1"\n'
    if bound:
        with pytest.raises(Faults, match="bound here already"):
            learned("#\n#\n" + text, map_of(text), Control("cc", 21, 1), "")
    else:
        assert learned(text, map_of(text), Control("cc", 21, 1), 'fibers = "r"').startswith(text)


def test_binds_in_one_list_cannot_be_added_to(make_rig):
    from composer.rig.select import Selector
    from player.inputs.map_file import read_map

    text = 'bind = [ { midi = { cc = 1 }, fibers = "r.1" } ]\n'
    with pytest.raises(Faults, match=r"hand:1: the binds stand in one list"):
        learned(text, read_map(text, "hand", Selector(make_rig(1), {}), ()), Control("cc", 2, 1), "")


@given(
    st.sampled_from(["cc", "cc14", "note", "poly_pressure"]),
    st.integers(0, 31),
    st.integers(1, 16),
    st.sampled_from(["", "\n", "# end", "#\n\n"]),
)
def test_whatever_is_learnt_is_read_back_as_it_was(map_of, kind, number, channel, tail):
    control = Control(kind, number, channel)
    text = learned(tail, NO_MAP, control, 'fibers = "r.1"\npickup = true')
    assert map_of(text).binds[0].control == control
