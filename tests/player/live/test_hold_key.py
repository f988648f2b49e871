import pytest

from player.live.hold_key import AGAIN_S, FIRST_S, LEAST_S, HoldKey


def held(key, seconds, delay_s, between_s):
    """Hold a key for so long from 0 s; the moment of its last repeat."""
    at = 0.0
    assert key.pressed(at)
    at = delay_s
    while at < seconds:
        assert not key.is_up(at)
        assert not key.pressed(at)
        last, at = at, at + between_s
    return last


@pytest.mark.parametrize(("delay_s", "between_s"), [(0.66, 0.04), (0.25, 0.092), (0.5, 0.033), (0.4, 0.2)])
def test_a_key_of_any_keyboard_stays_down_while_it_is_held_and_is_up_soon_after(delay_s, between_s):
    key = HoldKey()
    last = held(key, 5.0, delay_s, between_s)
    bound = min(AGAIN_S, max(LEAST_S, 2.5 * between_s))
    assert not key.is_up(last + 0.99 * bound)
    assert key.is_up(last + 1.01 * bound)
    assert not key.down and not key.is_up(last + 9.0)


def test_a_key_that_is_tapped_is_up_once_a_repeat_would_have_come():
    key = HoldKey()
    assert key.pressed(10.0)
    assert not key.is_up(10.0 + FIRST_S)
    assert key.is_up(10.0 + FIRST_S + 0.01)


def test_a_repeat_that_is_late_once_makes_it_wait_longer_from_then_on():
    key = HoldKey()
    last = held(key, 3.0, 0.5, 0.04)
    assert not key.pressed(last + 0.09)
    assert not key.is_up(last + 0.09 + 0.2)
    assert key.is_up(last + 0.09 + 0.23)


def test_pressed_again_it_begins_anew():
    key = HoldKey()
    last = held(key, 3.0, 0.5, 0.04)
    assert key.is_up(last + 1.0)
    assert key.pressed(last + 2.0)
    assert not key.is_up(last + 2.0 + FIRST_S - 0.01)
