"""A bind changed in the text of a map: nothing else is touched."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.faults import Faults
from composer.rig.select import Selector
from player.inputs.map_file import read_map
from player.inputs.model import Control, Stroke
from player.window.map_text import bind_of, changed

TEXT = """# faders of the table
[source]
silence_s = 0   # may lie still

[[bind]]
midi = { cc = 21, channel = 1 }  # the whole # curtain
fibers = "a.*"       # by hand
high = 0.8           # room for accents
# curve = "steep"
pickup = true

[[bind]]
midi = { note = 36 }
does = "vent"
"""

NAMES = ("a.1", "a.2", "b # 1")


def read(text):
    return read_map(text, "hand.map.toml", Selector(NAMES, {}), ())


def test_only_the_value_changes_and_its_comment_stays_where_it_was():
    after = changed(TEXT, read(TEXT), 0, {"high": "0.65"})
    assert after == TEXT.replace("high = 0.8           # room", "high = 0.65          # room")


def test_a_key_that_is_not_there_yet_comes_behind_the_last_of_its_bind():
    after = changed(TEXT, read(TEXT), 0, {"low": "0.1"})
    assert after == TEXT.replace("pickup = true\n", "pickup = true\nlow = 0.1\n")
    assert read(after).binds[0].deed.low == 0.1


def test_a_key_in_a_comment_is_none():
    after = changed(TEXT, read(TEXT), 0, {"curve": '"gentle"'})
    assert '# curve = "steep"' in after and read(after).binds[0].deed.curve == "gentle"


def test_a_value_with_a_number_sign_in_it_is_changed_whole():
    text = changed(TEXT, read(TEXT), 0, {"fibers": '"b # 1"'})
    again = changed(text, read(text), 0, {"fibers": '"a.1"'})
    assert read(text).binds[0].deed.fibers == (2,) and 'fibers = "a.1"       # by hand' in again


def test_a_bind_that_did_something_else_gets_fibers_in_its_place():
    after = changed(TEXT, read(TEXT), 1, {"fibers": '"a.1"', "does": None})
    bind = read(after).binds[1]
    assert isinstance(bind.deed, Stroke) and bind.deed.fibers == (0,) and bind.control == Control("note", 36)
    assert after.startswith(TEXT[: TEXT.index("[[bind]]\nmidi = { note")])


def test_line_ends_stay_as_they_are():
    text = TEXT.replace("\n", "\r\n")
    after = changed(text, read(text), 0, {"high": "0.5"})
    assert after.count("\r\n") == text.count("\r\n") and after.count("\n") == after.count("\r\n")


def test_binds_in_one_list_are_refused_at_their_line():
    text = 'bind = [{ midi = { cc = 1 }, fibers = "a.*" }]\n'
    with pytest.raises(Faults) as wrong:
        changed(text, read(text), 0, {"high": "0.5"})
    assert "hand.map.toml:1" in str(wrong.value) and "stand in one list" in str(wrong.value)


@given(st.floats(0.0, 1.0), st.floats(0.0, 1.0), st.sampled_from(["linear", "gentle", "steep"]))
def test_whatever_is_set_is_read_back_and_all_other_lines_stay(low, high, curve):
    after = changed(TEXT, read(TEXT), 0, {"low": f"{low:.3f}", "high": f"{high:.3f}", "curve": f'"{curve}"'})
    deed = read(after).binds[0].deed
    assert (deed.low, deed.high, deed.curve) == (pytest.approx(low, abs=1e-3), pytest.approx(high, abs=1e-3), curve)
    kept = [line for line in TEXT.splitlines() if not line.startswith("high")]
    assert [line for line in after.splitlines() if line in kept] == kept
    assert read(after).binds[1] == read(TEXT).binds[1].__class__(
        read(TEXT).binds[1].control, "", read(TEXT).binds[1].deed, read(after).binds[1].line
    )


def test_a_control_is_found_by_kind_number_and_channel():
    map_ = read(TEXT)
    assert bind_of(map_, Control("cc", 21, 1)) == 0
    assert bind_of(map_, Control("note", 36, 9)) == 1
    assert bind_of(map_, Control("cc", 21, 2)) is None
