"""What may stand at a place of the text."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.edits.colouring import CLASSES, colours_of
from composer.edits.completion import complete
from composer.edits.hover import explain
from composer.score.words import STATEMENTS

from .making import DEMOS, demo, text_of

AFTER = text_of("estuary") + "\n"


def offers(tail: str, made: bool = True) -> list[str]:
    text = AFTER + tail
    lines = text.split("\n")
    return [one.text for one in complete(text, len(lines), len(lines[-1]) + 1, demo("estuary") if made else None)]


def test_in_column_1_the_statements_are_offered_in_their_order():
    assert offers("") == [name for name in STATEMENTS if " " not in name]
    assert offers("se")[0] == "section"


def test_an_entry_begins_with_groups_then_ranges_then_fibers():
    found = offers("section n at 2:1\n  ")
    assert found[:4] == ["odd", "banks", "reeds", "far"]
    assert found.index("reeds") < found.index("reed.1-24") < found.index("reed.7")


def test_what_is_typed_comes_first_where_it_begins_a_name_then_behind_a_dot():
    assert offers("section n at 2:1\n  le") == ["bank.left"]
    assert offers("section n at 2:1\n  reed.3-")[0] == "reed.3-24"


def test_phrases_are_offered_nearest_first_and_a_misspelt_one_is_still_found():
    assert offers("section n at 2:1\n  reeds ")[:2] == ["gust", "surge"]
    assert offers("section n at 2:1\n  reeds gahter") == ["gather"]


def test_options_that_the_line_has_are_not_offered_again():
    found = offers("section n at 2:1\n  reeds gather after 2 canon 1/4 ")
    assert found[0] == "from"
    assert not {"after", "at", "canon"} & set(found)
    assert {"ripple", "scale", "add"} <= set(found)


def test_a_move_has_targets_then_shapes_and_manners():
    assert offers("phrase q\n  3 ")[:3] == ["rest", "full", "hold"]
    assert offers("phrase q\n  3 full ")[:2] == ["smooth", "linear"]
    assert "smooth" not in offers("phrase q\n  3 full linear ")
    assert offers("phrase q\n  3 full o") == ["over"]


def test_units_are_offered_behind_a_number():
    assert offers("phrase q\n  12") == ["12", "12s", "12ms", "12bars"]
    assert offers("phrase q\n  3 12") == ["12", "12%", "12mm", "12deg", "0.12"]
    assert offers("section n at 2:1\n  reeds gather ripple 0.8 ") == ["0.8 m/s"]
    assert offers("phrase q\n  3 full quiver 4") == ["4Hz"]


def test_who_types_a_percentage_of_the_stroke_is_offered_the_share_that_means_it():
    text = "phrase q\n  3 70"
    (share,) = [one for one in complete(text, 2, 7) if one.text == "0.7"]
    assert share.says == "70 % of the usable stroke"
    (strain,) = [one for one in complete(text, 2, 7) if one.text == "70%"]
    assert strain.says.startswith("strain")


def test_with_nothing_typed_a_target_and_a_distance_show_the_forms_that_they_may_have():
    assert {"0.5", "12%", "240mm", "90deg"} <= set(offers("phrase q\n  3 "))
    assert {"1", "1/2", "1bar", "2bars", "1.5s"} <= set(offers("section n at 2:1\n  reeds gather times 3 every "))


def _paths(typed, ending):
    there = {"": ["a.rig.toml", "my rig.rig.toml", "rigs/b.rig.toml", "c.score"], "rigs/": ["rigs/b.rig.toml", "rigs/old/"]}
    return [one for one in there[typed[: typed.rfind("/") + 1]] if one.endswith((ending, "/"))]


@pytest.mark.parametrize(
    ("row", "found"),
    [
        ("rig ", ["a.rig.toml", '"my rig.rig.toml"', "rigs/b.rig.toml"]),
        ("rig a", ["a.rig.toml"]),
        ("rig b", ["rigs/b.rig.toml"]),
        ("rig rigs/", ["rigs/b.rig.toml", "rigs/old/"]),
        ('rig "my', ['"my rig.rig.toml"']),
        ("use ", ["c.score"]),
    ],
)
def test_behind_rig_and_use_the_files_that_are_there_are_offered(row, found):
    offered = complete(row, 1, len(row) + 1, paths=_paths)
    assert [one.text for one in offered] == found
    assert {one.start for one in offered} == {5} and {one.kind for one in offered} == {"path"}


def test_places_are_found_by_the_names_of_cues_and_sections_the_nearest_first():
    assert offers("section n at ebb") == ["9:1"]
    assert offers("section n at 40:1\n  reeds gather at ")[0] == "41:1"
    assert offers("section n at dr")[0] == "17:1"


def test_a_cue_is_offered_the_names_of_sections_that_have_none():
    assert offers('cue "') == ['"draw"', '"gust"']


def test_in_a_comment_and_behind_a_fault_nothing_is_offered():
    assert offers("# se") == []
    assert offers("section 5 at ") == []
    assert complete("  3 ", 1, 5) == ()


def test_without_a_rig_the_language_and_the_texts_own_names_are_offered():
    assert "odd" in offers("section n at 2:1\n  ", made=False)
    assert "reed.1" not in offers("section n at 2:1\n  ", made=False)


def test_an_offer_takes_the_place_of_the_whole_word():
    found = complete("section n at 2:1\n  reeds gather canno 1/4", 2, 20, demo("estuary"))
    assert (found[0].text, found[0].start, found[0].end) == ("canon", 16, 21)


@pytest.mark.parametrize("name", DEMOS)
def test_at_every_column_of_the_demo_scores_there_are_offers_or_none_and_the_word_there_is_among_them(name):
    text, state = text_of(name), demo(name)
    for number, line in enumerate(text.split("\n"), 1):
        for column in range(1, len(line) + 2):
            for one in complete(text, number, column, state):
                assert one.kind in CLASSES
                assert 1 <= one.start <= column
                assert one.start <= one.end <= len(line) + 1


@pytest.mark.parametrize("name", DEMOS)
def test_demo_scores_cut_off_anywhere_never_fail(name):
    text, state = text_of(name), demo(name)
    for end in range(0, len(text) + 1, 3):
        cut = text[:end]
        complete(cut, cut.count("\n") + 1, len(cut) - cut.rfind("\n"), state)


@given(st.text(max_size=30), st.integers(-1, 4), st.integers(-2, 40))
def test_no_text_and_no_place_is_more_than_can_be_completed(text, line, column):
    for one in complete(text, line, column, demo("gannet")):
        assert one.text


@pytest.mark.parametrize("name", DEMOS)
def test_every_word_of_the_language_in_the_demo_scores_is_offered_where_it_stands(name):
    text, state = text_of(name), demo(name)
    colours = colours_of(text)
    for number, (line, classes) in enumerate(zip(colours.lines, colours.classes, strict=True), 1):
        for start, end, kind in classes:
            if kind in ("statement", "option", "shape", "manner", "target", "word", "phrase", "fiber") and not (
                kind == "phrase" and line.startswith("phrase")
            ):
                whole = "\n".join([*text.split("\n")[: number - 1], line[: start + 1], *text.split("\n")[number:]])
                assert line[start:end] in {one.text for one in complete(whole, number, start + 2, state)}, line


@pytest.mark.parametrize("piece", ["x", "x ", "x, ", "reed.1, ", '"', "a=", "* ", "0.8 "])
def test_a_line_as_long_as_a_line_may_be_is_completed_coloured_and_explained(piece):
    state = demo("estuary")
    for line in (piece * (90_000 // len(piece)), "  " + piece * (90_000 // len(piece)), "  " + "x" * 90_000 + " " + piece):
        text = f"section s at 1:1\n{line}"
        assert colours_of(text).lines[1] == line
        for column in (3, 45_000, len(line) + 1):
            complete(text, 2, column, state)
            explain(text, 2, column, state)
