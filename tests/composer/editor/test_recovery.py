"""Files of recovery: whole, cut short, damaged."""

from hypothesis import given
from hypothesis import strategies as st

from composer.editor import recovery
from composer.editor.deltas import Delta, Units

deltas = st.lists(st.tuples(st.floats(0, 1), st.floats(0, 1), st.text(max_size=5)), max_size=12)


def written(text, changes):
    """The bytes of a file with those changes, and the text after each."""
    units, data, texts = Units(text), [b"".join(recovery.begin("a.score", "h", text))], [text]
    for where, share, put in changes:
        at = int(where * len(units))
        delta = Delta(at, int(share * (len(units) - at)), put)
        units.change(delta)
        data.append(recovery.change(delta))
        texts.append(units.text)
    return data, texts


@given(st.text(max_size=20), deltas)
def test_what_is_read_back_is_the_text_after_the_last_change(text, changes):
    data, texts = written(text, changes)
    found = recovery.read(b"".join(data))
    assert (found.text, found.changes, found.of, found.saved) == (texts[-1], len(changes), "a.score", "h")


@given(st.text(max_size=20), deltas, st.floats(0, 1))
def test_a_file_cut_anywhere_gives_the_text_after_the_last_whole_change(text, changes, where):
    data, texts = written(text, changes)
    whole = b"".join(data)
    cut = len(data[0]) + int(where * (len(whole) - len(data[0])))
    count, reached = 0, len(data[0])
    for line in data[1:]:
        # A line without its line feed is whole too.
        if reached + len(line) - 1 > cut:
            break
        reached += len(line)
        count += 1
    assert recovery.read(whole[:cut]).text == texts[count]


def test_a_damaged_line_ends_what_is_believed():
    data, texts = written("abc", [(0, 0, "x"), (0, 0, "y")])
    spoilt = data[1].replace(b'"x"', b'"z"')
    assert recovery.read(data[0] + spoilt + data[2]).text == texts[0]


def test_what_is_no_file_of_recovery_is_none():
    assert recovery.read(b"") is None
    assert recovery.read(b"title\n") is None
    assert recovery.read(b"".join(recovery.begin("a", "h", "text"))[:-8]) is None


def test_it_lies_beside_its_score_and_is_hidden():
    assert recovery.name_beside("pieces/", "a.score") == "pieces/.a.score.unsaved"


def test_a_long_text_is_kept_in_parts():
    text = "reeds gather\n" * 60_000
    lines = list(recovery.begin("", "", text))
    assert len(lines) == 1 + -(-len(text) // recovery.PART) > 2
    assert recovery.read(b"".join(lines)).text == text
    assert recovery.read(b"".join(lines[:-1])) is None
