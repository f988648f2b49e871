import numpy as np
import pytest

from player.inputs.feedback import EVERY_S, HANDS_OFF_S, MOST_A_CALL, Feedback
from player.inputs.midi import MidiBinds


def bind(midi, rest='fibers = "r.1"'):
    return f"[[bind]]\nmidi = {{ {midi} }}\n{rest}\n"


def sent(feedback, now_s, stroke, playing=()):
    return [message.hex() for _, message in feedback.messages(now_s, np.array(stroke, dtype=float), playing)]


def test_a_fader_is_sent_what_the_governor_lets_through_and_only_when_it_changes(map_of):
    feedback = Feedback(map_of(bind("cc = 7, channel = 3", 'fibers = "r.1-2"\nhigh = 0.5')))
    assert sent(feedback, 0.0, [0.2, 0.3, 0, 0]) == ["B2 07 40"]
    assert sent(feedback, 1.0, [0.2, 0.3, 0, 0]) == []
    assert sent(feedback, 2.0, [0.5, 0.5, 0, 0]) == ["B2 07 7F"]
    assert sent(feedback, 2.0 + 0.5 * EVERY_S, [0, 0, 0, 0]) == []
    assert sent(feedback, 2.0 + 1.5 * EVERY_S, [0, 0, 0, 0]) == ["B2 07 00"]


@pytest.mark.parametrize(
    ("midi", "bytes_sent"), [("cc14 = 3", ["B0 03 40", "B0 23 00"]), ("bend = true", ["E0 00 40"]), ("note = 36", ["90 24 40"])]
)
def test_each_kind_of_control_is_sent_its_own_messages(map_of, midi, bytes_sent):
    assert sent(Feedback(map_of(bind(midi))), 0.0, [0.5, 0, 0, 0]) == bytes_sent


def test_what_is_sent_to_a_14_bit_control_comes_back_as_the_same_stroke(map_of):
    map_ = map_of(bind("cc14 = 3", 'fibers = "r.1"\nlow = 0.1\nhigh = 0.9\ncurve = "gentle"'))
    feedback, binds = Feedback(map_), MidiBinds(map_, 4)
    for number, stroke in enumerate(np.linspace(0.1, 0.9, 50)):
        messages = feedback.messages(float(number), np.full(4, stroke))
        events = [event for _, message in messages for event in binds.hear("box", message, float(number))]
        assert events[-1].stroke == pytest.approx(stroke, abs=2e-4)


def test_a_motor_does_not_fight_a_hand(map_of):
    feedback = Feedback(map_of(bind("cc = 7")))
    feedback.heard(0, 1.0)
    assert sent(feedback, 1.0 + 0.9 * HANDS_OFF_S, [1, 0, 0, 0]) == []
    assert sent(feedback, 1.0 + 1.1 * HANDS_OFF_S, [1, 0, 0, 0]) == ["B0 07 7F"]


def test_a_light_is_on_while_its_phrase_plays(map_of):
    feedback = Feedback(map_of(bind("note = 36", 'phrase = "flick"\non = "r.1"')))
    assert sent(feedback, 0.0, [0, 0, 0, 0], {0}) == ["90 24 7F"]
    assert sent(feedback, 1.0, [0, 0, 0, 0]) == ["90 24 00"]


def test_many_controls_take_turns(map_of):
    feedback = Feedback(map_of("".join(bind(f"cc = {n}") for n in range(100))))
    seen = []
    for number in range(13):
        now = sent(feedback, 0.005 * number, [1, 0, 0, 0])
        assert len(now) <= MOST_A_CALL
        seen += now
    assert len(set(seen)) == 100


def test_a_controller_plugged_in_again_is_sent_all_values_anew(map_of):
    feedback = Feedback(map_of(bind("cc = 7")))
    assert len(sent(feedback, 0.0, [1, 0, 0, 0])) == 1
    feedback.again()
    assert len(sent(feedback, 1.0, [1, 0, 0, 0])) == 1


def test_a_bind_names_the_port_that_it_is_sent_to(map_of):
    feedback = Feedback(map_of(bind('cc = 7, port = "faders"')))
    assert [port for port, _ in feedback.messages(0.0, np.zeros(4))] == ["faders"]
