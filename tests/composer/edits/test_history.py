"""One history: nothing lost, words at a time, bounded."""

from hypothesis import given
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, invariant, rule

from composer.edits.edit import Edit, Refusal, apply
from composer.edits.history import MOST_BYTES, History, closed, do, names, redo, typed, undo
from composer.score.bounds import most


def keyed(text: str, history: History | None = None) -> History:
    history = history or History("")
    for character in text:
        history = typed(history, len(history.text), len(history.text), character)
    return history


def test_typing_is_taken_back_a_word_at_a_time():
    history = keyed("reeds gather after 8")
    assert names(history) == ("typed 8", "typed after", "typed gather", "typed reeds")
    assert undo(history)[0].text == "reeds gather after "


def test_a_new_line_is_a_step_of_its_own():
    assert len(names(keyed("a\nb"))) == 3


def test_backspaces_are_one_step():
    history = keyed("gather")
    history = closed(history)
    for end in (6, 5, 4):
        history = typed(history, end - 1, end, "")
    assert names(history)[0] == "removed her"
    assert undo(history)[0].text == "gather"


def test_the_caret_moved_ends_a_word():
    history = keyed("ga", None)
    history = keyed("ther", closed(history))
    assert len(names(history)) == 2


def test_a_drag_between_typing_is_a_step_with_its_own_name():
    history = keyed("3 full")
    history = do(history, Edit(((0, 1, "4"),), "offset 3 to 4 (line 1)"))
    history = typed(history, 6, 6, "!")
    assert names(history) == ("typed !", "offset 3 to 4 (line 1)", "typed full", "typed 3")


def test_what_was_undone_is_done_again_until_something_else_is_done():
    history = keyed("one two")
    back, edit = undo(history)
    assert apply("one two", edit) == back.text == "one "
    again, edit = redo(back)
    assert apply("one ", edit) == again.text == "one two"
    other = typed(back, 4, 4, "x")
    assert redo(other) == (other, None)


def test_at_either_end_there_is_nothing_more_to_do():
    assert undo(History("a")) == (History("a"), None)
    assert redo(History("a")) == (History("a"), None)
    assert typed(History("a"), 0, 1, "a") == History("a")


def test_a_paste_of_50_million_characters_is_refused_with_a_sentence_and_nothing_is_changed():
    refused = typed(History("title"), 0, 0, "x" * 50_000_000)
    assert isinstance(refused, Refusal)
    assert "50.0 million" in refused.say
    assert str(most("file")) in refused.say


def test_a_text_that_is_too_large_only_in_bytes_is_refused_too():
    assert isinstance(typed(History(""), 0, 0, "€" * (most("file") // 2)), Refusal)
    assert isinstance(typed(History(""), 0, 0, "\n" * (most("lines") + 2)), Refusal)


def test_memory_is_bounded_and_the_latest_steps_are_kept():
    history, large = History(""), "y" * (MOST_BYTES // 16)
    for _ in range(40):
        history = typed(history, 0, len(history.text), large)
        history = typed(history, 0, len(history.text), "z" + large)
        assert history.done.size <= MOST_BYTES
    assert history.done.count < 40
    back, _ = undo(history)
    assert back.text == large


class Written(RuleBasedStateMachine):
    """Any typing, drags, undoing and redoing: the history's text is the model's, and all the way back is where it began."""

    def __init__(self):
        super().__init__()
        self.history, self.text = History("start"), "start"

    @rule(at=st.integers(0, 99), width=st.integers(0, 3), new=st.text("ab \n", max_size=3))
    def replace(self, at, width, new):
        start = min(at, len(self.text))
        end = min(start + width, len(self.text))
        self.history = typed(self.history, start, end, new)
        self.text = self.text[:start] + new + self.text[end:]

    @rule(new=st.sampled_from("abc "))
    def key(self, new):
        self.history = typed(self.history, len(self.text), len(self.text), new)
        self.text += new

    @rule()
    def back_and_forth(self):
        back, edit = undo(self.history)
        if edit is not None:
            assert apply(self.text, edit) == back.text
            self.history, edit = redo(back)
            assert apply(back.text, edit) == self.text

    @rule()
    def back(self):
        self.history, edit = undo(self.history)
        self.text = self.text if edit is None else apply(self.text, edit)

    @invariant()
    def the_same(self):
        assert self.history.text == self.text

    @invariant()
    def all_the_way_back_is_where_it_began(self):
        at, edit = self.history, True
        while edit is not None:
            at, edit = undo(at)
        assert at.text == "start"


TestWritten = Written.TestCase


@given(st.text("ab \n", max_size=40))
def test_undoing_everything_typed_leaves_nothing_and_redoing_leaves_it_all(text):
    history = keyed(text)
    assert history.text == text
    edit = True
    while edit is not None:
        history, edit = undo(history)
    assert history.text == ""
    edit = True
    while edit is not None:
        history, edit = redo(history)
    assert history.text == text
