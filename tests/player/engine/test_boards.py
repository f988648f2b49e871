"""All outputs of a run as one."""

from player.engine.boards import Boards


def test_a_board_that_senses_is_waited_for_until_it_has_sensed_late_enough(kept):
    boards = Boards([kept(("left",), must_arm=True), kept(("right",), must_arm=True)])
    assert boards.sensing({"left": 1.0, "right": 2.5}, 2.0)
    assert not boards.sensing({"left": 2.0, "right": 2.5}, 2.0)


def test_what_senses_nothing_or_is_no_board_is_not_waited_for(kept):
    assert not Boards([kept(("left",), must_arm=True)]).sensing({}, 2.0)
    assert not Boards([kept(("left",))]).sensing({"left": 0.0}, 2.0)


def test_a_board_that_is_lost_is_not_waited_for(kept):
    lost = kept(("left",), must_arm=True)
    lost.lost_at = 0
    boards = Boards([lost])
    assert [event.kind for event in boards.send(1.0, None)] == ["lost"]
    assert not boards.sensing({"left": 0.0}, 2.0)
