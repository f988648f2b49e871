"""What holds a hit and what a pin costs, in words."""

import pytest

from composer.report.causes import cause_as_json, cause_in_words, pin_in_words
from composer.retime.proof import Cause, PinCost

NAMES = ["reed.1", "reed.2"]
FILL = "reed.1 needs 1.500 s for its move to 1:3 at its fastest fill"


class Seconds:
    """Places that are the seconds themselves, as bar 1."""

    def say_place(self, at_s):
        return f"1:{at_s:g}"


def cause(kind="move", fiber=0, from_s=1.0, to_s=3.0, needs_s=1.5, by="fill", after_s=None, pin=-1, line=7):
    return Cause(kind, fiber, from_s, to_s, needs_s, by, after_s, pin, line, 2.0)


@pytest.mark.parametrize(
    ("given", "says"),
    [
        (cause(), FILL),
        (cause(by="accel", needs_s=0.05), "reed.1 needs 50 ms for its move to 1:3, as it can speed up no harder"),
        (cause(after_s=0.5), f"{FILL}, and cannot leave before it has landed at 1:0.5"),
        (cause(after_s=0.0), f"{FILL}, and cannot leave before the start"),
        (cause(by="exhaust"), "reed.1 needs 1.500 s for its move to 1:3 at its fastest exhaust"),
        (cause(pin=0, by="speed"), "reed.1 needs 1.500 s for its move to 1:3 at its fastest; 1:3 is pinned"),
        (cause("order", None), "the hits at 1:1 and 1:3 keep their order"),
        (cause("pin", None), "the pin stands against the hit at 1:3"),
        (cause("hold"), "reed.1 may stay above half stroke no longer, from 1:1 to 1:3"),
        (cause("duty"), "the coil of reed.1 needs rest between 1:1 and 1:3"),
        (cause("air", None), "receiver and compressor have no more air between 1:1 and 1:3"),
        (cause("air", None, from_s=0.0), "receiver and compressor have no more air between the start and 1:3"),
        (cause("rest"), "reed.1 has no time left to wait between 1:1 and 1:3"),
        (cause("rhythm", None), "it keeps its distance from 1:1"),
    ],
)  # fmt: skip
def test_each_cause_is_one_sentence(given, says):
    assert cause_in_words(given, NAMES, Seconds()) == says


def test_a_cause_as_json_carries_the_sentence_and_its_numbers():
    told = cause_as_json(cause(), NAMES, Seconds())
    assert told["says"] == cause_in_words(cause(), NAMES, Seconds())
    assert (told["kind"], told["fiber"], told["needs_s"], told["line"], told["strokes"]) == ("move", "reed.1", 1.5, 7, 2.0)
    assert cause_as_json(cause("air", None), NAMES, Seconds())["fiber"] is None


def test_a_pins_cost_says_which_way_it_would_have_to_give():
    later, earlier, nothing = (pin_in_words(PinCost(0, force), 4.0, Seconds()) for force in (3.0, -3.0, 0.0))
    assert later.startswith("The pin at bar 1 count 4 costs 3 stroke-seconds a second: ")
    assert later.endswith("giving way 10 ms later (within 0.01s) would spare up to 0.03.")
    assert "10 ms earlier" in earlier
    assert nothing == "The pin at bar 1 count 4 holds nothing back."
