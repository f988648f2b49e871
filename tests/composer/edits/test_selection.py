"""Fibers as a score names them."""

from hypothesis import given
from hypothesis import strategies as st

from composer.edits.selection import selection
from composer.rig.select import Selector
from composer.score.names import groups_of

from .making import demo


@given(st.sets(st.integers(0, 47), min_size=1))
def test_what_is_named_means_those_fibers_and_no_others(fibers):
    state = demo("estuary")
    words = selection(fibers, state.score, state.rig)
    selector = Selector(state.rig, groups_of(state.score))
    assert {f for word in words.split(", ") for f in selector.resolve(word)} == fibers


def test_a_group_is_named_by_its_name_and_neighbours_as_a_range():
    state = demo("estuary")
    assert selection(range(36), state.score, state.rig) == "reeds"
    assert selection([0, 1, 2, 24, 25, 40], state.score, state.rig) == "reed.1-3, reed.far.1-2, silt.5"
