"""Snags that mend themselves: what is offered helps, and what does not help says why."""

import pytest

from composer.edits.edit import apply, inverse
from composer.edits.mending import WAYS, mends
from composer.limits.check import check
from composer.retime.choices import choices_of
from composer.retime.retiming import retime

from .making import DEMOS, demo, made, text_of

TOO_FAST = "tempo 60\nphrase p 12\n  4 rest\n  4+1/4 full\n  8 rest\nsection s at 2:1\n  r.1 p\n"


def retimed(state):
    firm, rhythm = choices_of(state.score, state.tracks, state.score.keep)
    return retime(
        state.tracks, state.abilities, state.rig, state.pins_s, state.score.keep, give_s=state.pins_give_s, firm=firm,
        rhythm=rhythm,
    )  # fmt: skip


def mended(text: str, rig, number: int = 0):
    state = made(text, rig)
    found = check(state.tracks, rig, state.abilities)
    return mends(text, state, found.snags[number], found, lambda new: made(new, rig), retimed(state))


def texts(text: str, mending) -> dict[str, str]:
    return {choice.way: apply(text, choice.edit) for choice in mending.choices}


def test_a_move_that_is_too_fast_is_given_time_and_what_follows_comes_later(make_rig):
    new = texts(TOO_FAST, mended(TOO_FAST, make_rig(1)))["time"]
    assert "  4 rest\n  5 full\n  8.75 rest\n" in new
    assert "phrase p 12.75\n" in new


def test_a_move_out_of_a_hold_leads_and_lands_where_it_did(make_rig):
    text = TOO_FAST.replace("  4 rest\n", "  1 0.1\n  4 hold\n")
    new = texts(text, mended(text, make_rig(1)))["lead"]
    assert "  1 0.1\n  3.375 hold\n  4+1/4 full\n" in new


def test_the_first_move_of_an_entry_leads_by_an_earlier_start(make_rig):
    text = "tempo 60\nphrase p\n  1/4 full\n  8 rest\nsection s at 2:1\n  r.1 p at 3:1\n"
    mending = mended(text, make_rig(1))
    assert "  1 full\n  8.75 rest\n" in texts(text, mending)["lead"]
    assert "at 2:4.25\n" in texts(text, mending)["lead"]


def test_a_move_that_leaves_where_another_lands_cannot_lead_and_says_so(make_rig):
    text = "tempo 60\nphrase p\n  4 full\n  4.5 rest\nsection s at 2:1\n  r.1 p\n"
    mending = mended(text, make_rig(1))
    assert "lead" not in texts(text, mending)
    assert mending.not_these["lead"] == "The move before it lands where this one leaves, so it cannot leave earlier."


def test_shrinking_scales_the_entry_by_what_fits(make_rig):
    new = texts(TOO_FAST, mended(TOO_FAST, make_rig(1)))["shrink"]
    # A smooth move of 0.3 at 0.6 a second takes 1.875 times 0.5 s; it has 0.25 s.
    assert "  r.1 p scale 0.26\n" in new


def test_a_scaled_entry_is_scaled_further_in_the_form_it_has(make_rig):
    text = TOO_FAST.replace("r.1 p", "r.1 p scale 4/5")
    assert "scale 33/125" in texts(text, mended(text, make_rig(1)))["shrink"]


def test_the_retimer_does_one_hit(make_rig):
    mending = mended(TOO_FAST, make_rig(1))
    choice = next(one for one in mending.choices if one.way == "retime")
    assert check(choice.after.tracks, choice.after.rig, choice.after.abilities).ok


def test_a_pin_is_offered_where_the_retiming_would_move_the_hit_and_shows_the_retimed_score(make_rig):
    text = "tempo 60\nphrase p\n  4 full\n  4.5 rest\nsection s at 2:1\n  r.1 p\n"
    choice = next(one for one in mended(text, make_rig(1)).choices if one.way == "pin")
    assert "pin 3:1.5\n" in apply(text, choice.edit) or "pin 3:1+1/2\n" in apply(text, choice.edit)
    assert choice.snags_left == 0
    assert 8.5 in choice.ghost.time_s.round(9)


def test_a_hit_that_stays_has_nothing_to_pin(make_rig):
    assert "nothing to pin" in mended(TOO_FAST, make_rig(1)).not_these["pin"]


def test_a_jump_becomes_a_sudden_move(make_rig):
    text = "tempo 60\nphrase p\n  4 full step\n  8 rest\nsection s at 2:1\n  r.1 p\n"
    assert "4 full sudden" in texts(text, mended(text, make_rig(1)))["time"]


def test_a_line_at_0_that_the_fiber_is_not_at_says_what_to_do(make_rig):
    text = "tempo 60\nphrase p\n  0 full\n  8 rest\nsection s at 2:1\n  r.1 p\n"
    assert "bring it there first" in mended(text, make_rig(1)).not_these["time"]


def test_what_is_above_the_stroke_shrinks_and_time_is_not_offered(make_rig):
    text = "tempo 60\nphrase p\n  4 1.25\n  8 rest\nsection s at 2:1\n  r.1 p\n"
    mending = mended(text, make_rig(1))
    assert "scale 0.80" in texts(text, mending)["shrink"]
    assert set(mending.not_these) == set()


def test_air_that_is_not_there_is_asked_less_of(make_rig):
    rig = make_rig(8, air_mL=300.0, receiver_L=0.5, compressor_L_min=6.0)
    text = "tempo 60\nphrase p\n  2 full\n  4 rest\nsection s at 2:1\n  r.* p\n"
    mending = mended(text, rig)
    new = texts(text, mending)
    assert "scale" in new["air"]
    assert check(mending.choices[0].after.tracks, rig, mending.choices[0].after.abilities).ok


def test_a_fiber_held_too_long_is_asked_for_less_or_left_to_the_retimer(make_rig):
    text = "tempo 60\nphrase p\n  2 full\n  12 hold\n  16 rest\nsection s at 2:1\n  r.1 p\n"
    new = texts(text, mended(text, make_rig(1, max_hold_s=4.0)))
    assert set(new) == {"shrink", "retime"}
    assert "scale 0.50" in new["shrink"]


def test_without_a_retiming_nothing_is_offered_that_needs_one(make_rig):
    rig = make_rig(1)
    state = made(TOO_FAST, rig)
    found = check(state.tracks, rig, state.abilities)
    mending = mends(TOO_FAST, state, found.snags[0], found, lambda new: made(new, rig))
    assert mending.not_these["retime"] == mending.not_these["pin"] == "There is no retiming yet."


@pytest.mark.parametrize("name", DEMOS)
def test_every_choice_for_the_demo_scores_helps_and_can_be_taken_back(name):
    text, state = text_of(name), demo(name)
    found = check(state.tracks, state.rig, state.abilities)
    retiming = retimed(state)
    seen = set()
    for snag in found.snags:
        key = (snag.kind, snag.line)
        if key in seen or len(seen) >= 2:
            continue
        seen.add(key)
        mending = mends(text, state, snag, found, lambda new: made(new, state.rig), retiming)
        assert mending.choices
        for choice in mending.choices:
            assert choice.way in WAYS
            new = apply(text, choice.edit)
            assert apply(new, inverse(text, choice.edit)) == text
            left = check(made(new, state.rig).tracks, state.rig, state.abilities).snags
            if choice.way != "pin":
                assert len(left) == choice.snags_left < len(found.snags)
        assert all(why.endswith(".") for why in mending.not_these.values())
