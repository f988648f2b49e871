"""Names in the hang view: where there is room for one."""

from hypothesis import given
from hypothesis import strategies as st

from composer.picture.hang.names import Taken

AT = st.floats(-300.0, 300.0)
BOXES = st.lists(st.tuples(AT, AT, st.floats(0.5, 90.0), st.floats(0.5, 30.0)), max_size=40)


def meet(one, other):
    return one[0] < other[2] and other[0] < one[2] and one[1] < other[3] and other[1] < one[3]


@given(BOXES)
def test_a_box_has_room_just_where_it_meets_none_of_those_before_it(corners):
    taken, there = Taken(48.0, 14.0), []
    for left, top, wide, high in corners:
        box = (left, top, left + wide, top + high)
        free = not any(meet(box, one) for one in there)
        assert taken.takes(box) == free
        if free:
            there.append(box)


@given(BOXES)
def test_what_is_put_there_anyway_is_kept_clear_of_too(corners):
    taken = Taken(48.0, 14.0)
    boxes = [(left, top, left + wide, top + high) for left, top, wide, high in corners]
    for box in boxes:
        assert taken.takes(box, anyway=True)
    assert not any(taken.takes(box) for box in boxes)
