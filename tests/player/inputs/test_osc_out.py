from pythonosc.osc_message import OscMessage

from player.inputs.osc_out import CUE, EVERY_S, MOST_SNAGS, SNAG, STATE, OscOut


def read(packets):
    """As python-osc reads them."""
    return [(message.address, message.params) for message in map(OscMessage, packets)]


def test_the_state_is_sent_at_once_when_it_changes_and_now_and_then_otherwise():
    out = OscOut()
    assert read(out.packets(0.0, "playing", 1.5, 72.0)) == [(STATE, ["playing", 1.5, 72.0])]
    assert out.packets(0.5 * EVERY_S, "playing", 1.6) == []
    assert read(out.packets(0.6 * EVERY_S, "paused", 1.75)) == [(STATE, ["paused", 1.75, 0.0])]
    assert len(out.packets(2.0 * EVERY_S, "paused", 1.75)) == 1


def test_a_cue_is_sent_once():
    out = OscOut()
    assert read(out.packets(0.0, "playing", 1.0, cue=("ebb", 0.5)))[1] == (CUE, ["ebb", 0.5])
    assert len(out.packets(1.0, "playing", 1.0, cue=("ebb", 0.5))) == 1


def test_cuts_are_sent_the_largest_first_and_not_more_often_than_anyone_can_read():
    out = OscOut()
    cuts = tuple(("rate", f"r.{n}", n / 100) for n in range(50))
    sent = read(out.packets(0.0, "playing", 0.0, cuts=cuts))[1:]
    assert len(sent) == MOST_SNAGS
    assert sent[0][0] == SNAG
    assert sent[0][1][:2] == ["rate", "r.49"]
    assert out.packets(0.5 * EVERY_S, "playing", 0.0, cuts=cuts) == []
