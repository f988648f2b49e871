"""The retiming taken into the text: what is written expands to the retimed times."""

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings

from composer.edits.edit import Refusal, apply, inverse
from composer.edits.taking import CLOSE_S, Taken, take
from composer.edits.threads import threads_of
from composer.faults import Faults
from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.motion import strain_at
from composer.retime.choices import choices_of
from composer.retime.programme import Unsolved
from composer.retime.retiming import Retiming, retime

from ..score.random_scores import scores
from .making import DEMOS, demo, made, text_of


def retimed(state, shrink: bool = False) -> Retiming:
    firm, rhythm = choices_of(state.score, state.tracks, state.score.keep)
    return retime(
        state.tracks, state.abilities, state.rig, state.pins_s, state.score.keep, shrink, give_s=state.pins_give_s, firm=firm,
        rhythm=rhythm,
    )  # fmt: skip


def taken(text: str, state, **where) -> Taken | Refusal:
    return take(text, state, retimed(state), lambda new: made(new, state.rig), **where)


def same_motion(one, other, abilities, tolerance: float = 1e-5) -> None:
    """The same strains wherever neither has a knot within a microsecond: begins and ends are those of both."""
    knots = np.unique(np.concatenate([one.time_s, other.time_s]))
    wide = np.flatnonzero(np.diff(knots) > 1e-5)
    times = (knots[wide, None] + np.diff(knots)[wide, None] * [0.25, 0.5, 0.75]).ravel()
    np.testing.assert_allclose(strain_at(one, abilities, times), strain_at(other, abilities, times), atol=tolerance)


@pytest.mark.parametrize("name", DEMOS)
def test_all_of_a_demo_scores_retiming_taken_in_checks_clean_and_moves_as_it_was_retimed(name):
    text, state = text_of(name), demo(name)
    retiming = retimed(state)
    found = take(text, state, retiming, lambda new: made(new, state.rig))
    assert found.off_s <= CLOSE_S
    assert check(found.after.tracks, state.rig, state.abilities).ok
    same_motion(found.after.tracks, retiming.tracks, state.abilities)
    assert apply(apply(text, found.edit), inverse(text, found.edit)) == text


def test_in_estuary_only_what_moved_is_written_anew():
    text, state = text_of("estuary"), demo("estuary")
    found = taken(text, state)
    old, new = (set(one.split("\n")) for one in (text, apply(text, found.edit)))
    assert {line.split()[0] + line.split()[1] for line in old - new} == {
        "reedsgather",
        "reedssurge",
        "silt.*swash",
        "streamsurge",
    }
    assert len(found.notes) == 2


def test_one_hit_taken_in_leaves_the_others_to_the_retimer():
    text, state = text_of("estuary"), demo("estuary")
    retiming = retimed(state)
    first = retiming.hits_moved[0]
    found = take(text, state, retiming, lambda new: made(new, state.rig), first.was_s, first.was_s)
    left = check(found.after.tracks, state.rig, state.abilities).snags
    was = check(state.tracks, state.rig, state.abilities).snags
    assert len(was) - len(left) == 12
    assert not any(first.was_s - 2.0 < snag.to_s <= first.was_s + 0.1 for snag in left)
    assert "taken in" in found.edit.say


def test_a_fraction_that_has_not_moved_stays_one_and_others_keep_their_unit(make_rig):
    text = "tempo 60\nphrase p\n  3/4 full\n  1s rest\n  3 rest\nsection s at 2:1\n  r.1 p\n"
    found = taken(text, made(text, make_rig(1, fill=0.6, exhaust=0.3, stroke=0.3)))
    new = apply(text, found.edit)
    assert "s rest" in new
    assert check(found.after.tracks, found.after.rig, found.after.abilities).ok


def test_a_phrase_that_others_play_untouched_is_copied_and_theirs_stays(make_rig):
    text = "tempo 60\nphrase p\n  4 full\n  8 rest\nsection s at 2:1\n  r.1 p\n  r.2 p after 20 stretch 1/16\n"
    found = taken(text, made(text, make_rig(2)))
    new = apply(text, found.edit)
    assert "phrase p\n  4 full\n  8 rest\n" in new
    assert "phrase p-s" in new
    assert "  r.1 p\n" in new
    assert "  r.2 p-s" in new


def test_a_phrase_that_one_entry_plays_is_rewritten_where_it_stands(make_rig):
    text = "tempo 60\nphrase p\n  1/8 full\n  8 rest\nsection s at 2:1\n  r.* p\n"
    new = apply(text, taken(text, made(text, make_rig(2))).edit)
    assert new.count("phrase") == 1
    assert "  15/16 full\n  8+13/16 rest\n" in new


def test_a_lead_is_an_earlier_start(make_rig):
    text = "tempo 60\nphrase p\n  1/4 full\n  8 rest\nsection s at 2:1\n  r.1 p\n"
    found = taken(text, made(text, make_rig(1)))
    assert "r.1 p at 1:4.3125\n" in apply(text, found.edit)
    assert threads_of(found.after).instances.until_s[0] == pytest.approx(4.25, abs=1e-6)


def test_where_one_leg_of_a_canon_moved_plain_entries_say_so(make_rig):
    text = "tempo 60\npin 5:1\nphrase p\n  1 full\n  2 rest\nsection s at 1:1\n  r.* p canon 1/4\n"
    text += "section t at 3:2\n  r.2 p stretch 1/4\n"
    found = taken(text, made(text, make_rig(3)))
    assert isinstance(found, Taken)
    assert check(found.after.tracks, found.after.rig, found.after.abilities).ok


def test_what_lies_over_one_another_is_written_out_move_by_move_where_no_number_says_it(make_rig):
    text = (
        "tempo 60\nphrase p\n  8 0.5\n  16 rest\nphrase q\n  1/8 0.4\n  4 rest\nsection s at 1:1\n  r.1 p\n"
        "  r.1 q after 3 add\n  r.2 p\n  r.1 q after 24\n"
    )
    found = taken(text, made(text, make_rig(2)))
    assert check(found.after.tracks, found.after.rig, found.after.abilities).ok
    assert found.off_s <= CLOSE_S


def test_where_there_is_nothing_to_take_in_that_is_said(make_rig):
    text = "tempo 60\nphrase p\n  4 full\n  8 rest\nsection s at 2:1\n  r.1 p\n"
    assert isinstance(taken(text, made(text, make_rig(1))), Refusal)
    pinned = "tempo 60\npin 1:1\npin 1:1.5\nphrase p\n  1/2 full\nsection s at 1:1\n  r.1 p\n  r.2 p after 8\n"
    state = made(pinned, make_rig(2, fill=0.1))
    assert isinstance(taken(pinned, state), Refusal)
    shrunk = take(pinned, state, retimed(state, shrink=True), lambda new: made(new, state.rig))
    assert isinstance(shrunk, Refusal)
    assert "shrink" in shrunk.say


@settings(max_examples=12, deadline=None, suppress_health_check=list(HealthCheck))
@given(text=scores())
def test_any_retiming_taken_in_expands_to_the_retimed_times(make_rig, text):
    rig = make_rig(4, fill=0.35, exhaust=0.25, receiver_L=1000.0)
    try:
        state = made(text, rig)
        retiming = retimed(state)
    except (Faults, Unsolved):
        assume(False)
    found = take(text, state, retiming, lambda new: made(new, rig))
    if isinstance(found, Refusal):
        assert found.say == "The retiming moves nothing there."
        assert not retiming.hits_moved
        assert not retiming.leads
        return
    assert found.off_s <= CLOSE_S, found.notes
    new = apply(text, found.edit)
    assert apply(new, inverse(text, found.edit)) == text
    abilities = abilities_of(rig)
    same_motion(made(new, rig).tracks, retiming.tracks, abilities, 1e-4)
