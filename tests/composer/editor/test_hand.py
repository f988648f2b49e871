"""A drag, question by question."""

from fractions import Fraction

import pytest

from composer.editor.hand import Hand
from composer.editor.messages import Dragged
from composer.edits.edit import Edit, Refusal


class Asked:
    """Questions that wait for an answer."""

    def __init__(self):
        self.open = []

    def __call__(self, what, about, then):
        self.open.append((what, about, then))

    def answer(self, value):
        self.open.pop(0)[2](value)


def to(number):
    """An answer that tells of an edit."""
    return Dragged(Edit(((0, 1, str(number)),), f"to {number}"), None)


@pytest.fixture
def drag(qapp):
    asked = Asked()
    hand = Hand(asked)
    told = {"moved": [], "dropped": [], "refused": [], "ended": []}
    hand.moved.connect(told["moved"].append)
    hand.dropped.connect(told["dropped"].append)
    hand.refused.connect(told["refused"].append)
    hand.ended.connect(lambda: told["ended"].append(True))
    return hand, asked, told


def test_while_a_question_is_open_only_the_newest_place_is_remembered(drag):
    hand, asked, told = drag
    for at in (1.0, 2.0, 3.0, 4.0):
        hand.carry(7, at, None, False)
    assert [about for _, about, _ in asked.open] == [(7, 1.0, None, Fraction(1, 4), False)]
    asked.answer(to(1))
    assert [about[1] for _, about, _ in asked.open] == [4.0]
    assert [one.edit.say for one in told["moved"]] == ["to 1"]


def test_let_go_it_waits_for_the_last_answer_and_gives_that_edit(drag):
    hand, asked, told = drag
    hand.carry(7, 1.0, None, False)
    hand.carry(7, 2.0, None, False)
    hand.let_go(True)
    asked.answer(to(1))
    assert told["dropped"] == []
    asked.answer(to(2))
    assert [edit.say for edit in told["dropped"]] == ["to 2"]
    assert told["ended"] == [True]
    assert not hand.carries


def test_put_back_it_gives_none(drag):
    hand, asked, told = drag
    hand.carry(7, 1.0, None, False)
    asked.answer(to(1))
    hand.carry(7, 0.5, None, True)
    hand.let_go(False)
    asked.answer(to(0))
    assert told["dropped"] == []
    assert told["ended"] == [True]


def test_a_place_that_is_refused_says_why_and_changes_nothing(drag):
    hand, asked, told = drag
    hand.carry(7, 1.0, None, False)
    asked.answer(Refusal("Not there."))
    hand.let_go(True)
    assert told["refused"] == ["Not there."]
    assert told["dropped"] == []


def test_when_the_text_changes_under_it_nothing_is_done(drag):
    hand, asked, told = drag
    hand.carry(7, 1.0, None, False)
    asked.answer(to(1))
    hand.forget()
    hand.let_go(True)
    assert told["dropped"] == []


def test_the_grid_goes_with_the_question(drag):
    hand, asked, _ = drag
    hand.grid = Fraction(1, 3)
    hand.carry(7, None, 0.2, False)
    assert asked.open[0][1] == (7, None, 0.2, Fraction(1, 3), False)
