"""Knots and hits dragged: one number rewritten in its own form, and what moves with it."""

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from composer.edits.colouring import colours_of
from composer.edits.dragging import GRIDS, copy_for_this_one, drag, drag_hit, grip, knot_near
from composer.edits.edit import Edit, Refusal, apply, inverse
from composer.edits.instances import instances_of
from composer.faults import Faults
from composer.score.numbers import written

from ..score.random_scores import scores
from .making import demo, made, text_of

HEAD = "tempo 60\nphrase up 8\n  1/2 rest\n  2 0.5 smooth\n  3.5 hold\n  6 rest over 3/2\n"
TEXT = f"""{HEAD}phrase in
  0 rest
  500ms full sudden
section s at 2:1
  r.1 up
  r.2 up after 4 stretch 2
  r.3 in at 20s scale 0.5
  r.4 up after 1bar
"""


def numbers(text: str) -> list[tuple[int, str]]:
    """Every number and place of a text, with its line."""
    colours = colours_of(text)
    return [
        (n, line[start:end])
        for n, (line, classes) in enumerate(zip(colours.lines, colours.classes, strict=True))
        for start, end, kind in classes
        if kind in ("number", "place", "target")
    ]


def changed(before: str, after: str) -> list[tuple[str, str]]:
    old, new = numbers(before), numbers(after)
    assert len(old) == len(new)
    return [(a[1], b[1]) for a, b in zip(old, new, strict=True) if a != b]


def dragged(rig, text: str, fiber: int, was_s: float, **how) -> tuple[str, Edit | Refusal]:
    state = made(text, rig)
    edit = drag(text, state, grip(state, fiber, knot_near(state, fiber, was_s)), **how)
    return (apply(text, edit) if isinstance(edit, Edit) else text), edit


def instants(text: str, rig) -> list[tuple[int, int, float, float]]:
    state = made(text, rig)
    all_, _ = instances_of(state.score, rig, state.abilities, state.tempo)
    ends = np.where(all_.goes, all_.stops_s, all_.until_s)
    return sorted(
        zip(all_.fiber[all_.instance].tolist(), all_.line.tolist(), all_.leaves_s.tolist(), ends.tolist(), strict=True)
    )


def there(one, among) -> bool:
    """Whether an instant is among some, to a nanosecond."""
    return any((f, n) == one[:2] and abs(a - one[2]) + abs(b - one[3]) < 1e-9 for f, n, a, b in among)


def test_a_knot_dragged_in_time_rewrites_its_lines_offset_on_the_grid(make_rig):
    new, edit = dragged(make_rig(4), TEXT, 0, 6.0, time_s=6.3)
    assert changed(TEXT, new) == [("2", "2.25")]
    assert "offset 2 to 2.25 (line 4, in 3 places)" in edit.say


def test_off_the_grid_it_lands_where_it_was_let_go_to_a_thousandth(make_rig):
    new, _ = dragged(make_rig(4), TEXT, 0, 6.0, time_s=6.3217, free=True)
    assert changed(TEXT, new) == [("2", "2.322")]


def test_a_fraction_stays_a_fraction_on_any_grid(make_rig):
    new, _ = dragged(make_rig(4), TEXT, 0, 4.5, time_s=4.3, grid=Fraction(1, 3))
    assert changed(TEXT, new) == [("1/2", "1/3")]


def test_a_stretched_entrys_number_moves_half_as_far(make_rig):
    new, _ = dragged(make_rig(4), TEXT, 1, 12.0, time_s=13.0)
    assert changed(TEXT, new) == [("2", "2.5")]


def test_the_start_of_a_move_that_says_how_long_it_takes_is_that_number(make_rig):
    new, _ = dragged(make_rig(4), TEXT, 0, 8.5, time_s=8.0, grid=Fraction(1, 2))
    assert changed(TEXT, new) == [("3/2", "2")]


def test_milliseconds_stay_milliseconds_and_land_on_the_grid_of_counts(make_rig):
    new, _ = dragged(make_rig(4), TEXT, 2, 20.5, time_s=20.8)
    assert changed(TEXT, new) == [("500", "750")]


def test_a_line_at_0_hangs_from_its_entrys_start_and_seconds_stay_seconds(make_rig):
    text = TEXT.replace("0 rest\n", "0 0.1\n")
    new, _ = dragged(make_rig(4), text, 2, 20.0, time_s=21.1)
    assert changed(text, new) == [("20s", "21s")]


def test_bars_stay_bars(make_rig):
    text = TEXT.replace("1/2 rest", "1/2 0.2")
    state = made(text, make_rig(4))
    start = next(k for k in range(state.tracks.first[3], state.tracks.first[4]) if state.tracks.time_s[k] == 8.0)
    edit = drag(text, state, grip(state, 3, start), time_s=10.0)
    assert changed(text, apply(text, edit)) == [("1", "1.5")]


def test_a_place_stays_a_place_across_a_bar_line(make_rig):
    text = "tempo 60\nphrase p\n  1 0.5\nsection s at 2:1\n  r.1 p at 2:3+1/2\n"
    state = made(text, make_rig(1))
    edit = drag(text, state, grip(state, 0, 1), time_s=9.74, grid=Fraction(1, 4))
    assert changed(text, apply(text, edit)) == [("2:3+1/2", "3:2+3/4")]


def test_an_entry_without_a_start_of_its_own_takes_its_section_with_it_and_says_whom(make_rig):
    text = "tempo 60\nphrase p\n  1 0.5\nsection s at 2:1\n  r.1 p\n  r.2 p after 3\n  r.3 p at 9:1\n"
    state = made(text, make_rig(3))
    held = grip(state, 0, 1)
    assert held.players == (5, 6)
    edit = drag(text, state, held, time_s=5.0)
    assert apply(text, edit) == text.replace("2:1", "2:2")
    assert sorted(set(edit.moves.fiber.tolist())) == [0, 1]


def test_a_strain_rewrites_the_target_in_its_unit(make_rig):
    rig = make_rig(4, stroke=0.3)
    assert changed(TEXT, dragged(rig, TEXT, 0, 6.0, strain=0.21)[0]) == [("0.5", "0.7")]
    for was, now in (("12%", "15%"), ("48mm", "60mm"), ("2/5", "1/2")):
        text = TEXT.replace("2 0.5 ", f"2 {was} ")
        new, _ = dragged(rig, text, 0, 6.0, strain=0.15)
        assert f"2 {now} " in new


def test_full_becomes_a_number_only_when_it_must(make_rig):
    text = TEXT.replace("2 0.5 ", "2 full ")
    assert changed(text, dragged(make_rig(4), text, 0, 6.0, strain=0.299)[0]) == []
    assert "2 0.9 smooth" in dragged(make_rig(4), text, 0, 6.0, strain=0.27)[0]
    assert "2 rest smooth" in dragged(make_rig(4), text, 0, 6.0, strain=0.0)[0]


def test_a_scaled_entrys_target_moves_twice_as_far(make_rig):
    new, _ = dragged(make_rig(4, fill=10.0), TEXT, 2, 20.5, strain=0.12)
    assert "500ms 0.8 sudden" in new


def test_both_at_once_are_two_numbers(make_rig):
    new, _ = dragged(make_rig(4), TEXT, 0, 6.0, time_s=6.5, strain=0.21)
    assert changed(TEXT, new) == [("2", "2.5"), ("0.5", "0.7")]


def test_what_cannot_be_is_refused_in_words_and_nothing_changes(make_rig):
    rig = make_rig(4, fill=0.6)
    for fiber, was, time, words in (
        (0, 6.0, 8.0, "no later than the one before"),
        (0, 10.0, 30.0, "declared shorter than its last line"),
        (2, 20.2, 20.4, "sudden"),
    ):
        state = made(TEXT, rig)
        held = grip(state, fiber, knot_near(state, fiber, was))
        edit = drag(TEXT, state, held, time_s=time)
        assert isinstance(edit, Refusal), (fiber, was, edit)
        assert words in edit.say


def test_a_number_of_another_file_is_not_written(make_rig):
    text = "use w.score\ntempo 60\nsection s at 2:1\n  r.1 p after 1\n"
    state = made(text, make_rig(1), {"w.score": "phrase p\n  1 rest\n  2 0.5\n"})
    held = grip(state, 0, knot_near(state, 0, 7.0))
    assert held.time is None
    assert "w.score" in held.why_not_time
    assert "w.score" in held.why_not_target


def test_a_hit_is_dragged_by_the_fiber_under_the_pointer(make_rig):
    state = made(TEXT, make_rig(4))
    edit = drag_hit(TEXT, state, 6.02, 6.52, 0)
    assert changed(TEXT, apply(TEXT, edit)) == [("2", "2.5")]


def test_backwards_the_line_that_a_move_ends_at_is_the_one_before_it(make_rig):
    text = "tempo 60\nphrase p 8\n  0 rest\n  2 0.5\n  5 0.2\nsection s at 2:1\n  r.1 p retrograde\n"
    # Backwards: at 0.2 from the start to count 3, at 0.5 on count 6, at rest on count 8.
    assert changed(text, dragged(make_rig(1), text, 0, 10.0, time_s=11.0)[0]) == [("2", "1")]
    assert changed(text, dragged(make_rig(1), text, 0, 7.0, time_s=6.0)[0]) == [("5", "6")]
    assert "hold" not in text and changed(text, dragged(make_rig(1), text, 0, 10.0, strain=0.12)[0]) == [("0.5", "0.4")]


def test_a_phrase_in_many_places_lights_them_all(make_rig):
    text = "tempo 60\nphrase p 4\n  2 0.5\n  4 rest\nsection s at 1:1\n  r.* p times 20 every 4 canon 1/8\n"
    state = made(text, make_rig(4))
    edit = drag(text, state, grip(state, 2, knot_near(state, 2, 2.25)), time_s=2.75)
    assert len(edit.moves.places_s) == 20
    assert len(edit.moves.fiber) == 4 * 20 * 2
    assert "in 20 places" in edit.say
    assert set(edit.moves.line.tolist()) == {3, 4}


@settings(max_examples=30, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores(), pick=st.integers(0, 10**6), by=st.floats(-2.0, 2.0), grid=st.sampled_from(GRIDS), free=st.booleans())
def test_a_drag_rewrites_one_number_and_what_is_read_back_is_what_was_lit(make_rig, text, pick, by, grid, free):
    rig = make_rig(4)
    try:
        state = made(text, rig)
    except Faults:
        assume(False)
    knot = pick % len(state.tracks.time_s)
    fiber = int(np.searchsorted(state.tracks.first, knot, side="right")) - 1
    held = grip(state, fiber, knot)
    edit = drag(text, state, held, time_s=held.at_s + by, grid=grid, free=free)
    if isinstance(edit, Refusal):
        assert edit.say.endswith(".")
        return
    new = apply(text, edit)
    assert apply(new, inverse(text, edit)) == text
    differing = changed(text, new)
    assert len(differing) == len(edit.changes) <= 1
    for was, now in differing:
        kind, bare = held.hang.handle.unit, now.partition(":")[2] or now
        if not free and kind in ("counts", "place") and written(bare).form != "decimal":
            assert (written(bare).value / grid).denominator == 1
        if written(was.partition(":")[2] or was).form in ("fraction", "mixed"):
            assert written(bare).form in ("fraction", "mixed", "whole")
    before, after = instants(text, rig), instants(new, rig)
    lit = sorted(
        zip(
            edit.moves.fiber.tolist(),
            edit.moves.line.tolist(),
            edit.moves.from_s.tolist(),
            edit.moves.to_s.tolist(),
            strict=True,
        )
    )
    assert all(there(one, after) for one in lit)
    if len(before) == len(after):
        # What is read back may differ in its last digit where nothing was moved.
        assert all(there(one, lit) for one in after if not there(one, before))


@settings(max_examples=20, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores(), pick=st.integers(0, 10**6), by=st.floats(-0.5, 0.5))
def test_off_the_grid_a_line_lands_within_a_thousandth_of_a_count_or_a_ninety_sixth(make_rig, text, pick, by):
    rig = make_rig(4)
    try:
        state = made(text, rig)
    except Faults:
        assume(False)
    knot = pick % len(state.tracks.time_s)
    fiber = int(np.searchsorted(state.tracks.first, knot, side="right")) - 1
    held = grip(state, fiber, knot)
    assume(held.hang is not None and held.hang.edge in ("until", "start"))
    edit = drag(text, state, held, time_s=held.at_s + by, free=True)
    assume(isinstance(edit, Edit) and edit.changes)
    after = [end for f, _, a, b in instants(apply(text, edit), rig) if f == fiber for end in (a, b)]
    starts = made(apply(text, edit), rig).tracks
    after += starts.time_s[starts.first[fiber] : starts.first[fiber + 1]].tolist()
    # 45 counts a minute is the slowest of these scores; a stretched phrase moves that much farther.
    assert min(abs(end - held.at_s - by) for end in after) < 1.5 * 60 / 45 / 96


@settings(max_examples=20, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores(), pick=st.integers(0, 10**6), strain=st.floats(0.0, 0.3))
def test_a_strain_dragged_is_reached_to_a_step_of_its_unit(make_rig, text, pick, strain):
    rig = make_rig(4)
    try:
        state = made(text, rig)
    except Faults:
        assume(False)
    knot = pick % len(state.tracks.time_s)
    fiber = int(np.searchsorted(state.tracks.first, knot, side="right")) - 1
    held = grip(state, fiber, knot)
    edit = drag(text, state, held, strain=strain, free=True)
    if isinstance(edit, Refusal):
        return
    new = apply(text, edit)
    assert len(changed(text, new)) == len(edit.changes) <= 1
    assert made(new, rig).tracks.fibers == 4


@pytest.mark.parametrize("line", [77, 81, 102])
def test_a_copy_for_one_entry_changes_nothing_that_moves(line):
    text, state = text_of("estuary"), demo("estuary")
    edit = copy_for_this_one(text, state, line)
    new = apply(text, edit)
    again = made(new, state.rig)
    np.testing.assert_array_equal(again.tracks.time_s, state.tracks.time_s)
    np.testing.assert_array_equal(again.tracks.curve, state.tracks.curve)
    assert apply(new, inverse(text, edit)) == text
    assert len(again.score.phrases) == len(state.score.phrases) + 1


def test_a_phrase_of_another_file_is_copied_before_the_section_with_its_comments(make_rig):
    text = "use w.score\ntempo 60\n\n# the section\nsection s at 2:1\n  r.1 p after 1\n"
    state = made(text, make_rig(1), {"w.score": "phrase p 4 # soft\n  1 rest\n  # aside\n  2 0.5 # here\n"})
    new = apply(text, copy_for_this_one(text, state, 6))
    assert new == (
        "use w.score\ntempo 60\n\nphrase p-s 4 # soft\n  1 rest\n  # aside\n  2 0.5 # here\n\n"
        "# the section\nsection s at 2:1\n  r.1 p-s after 1\n"
    )


def test_a_phrase_that_one_entry_alone_plays_needs_no_copy(make_rig):
    text = "phrase p\n  1 full\nsection s at 2:1\n  r.1 p\n"
    assert isinstance(copy_for_this_one(text, made(text, make_rig(1)), 4), Refusal)
    assert isinstance(copy_for_this_one(text, made(text, make_rig(1)), 1), Refusal)
