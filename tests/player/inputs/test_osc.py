import math
import struct

import pytest
from hypothesis import given
from hypothesis import strategies as st
from pythonosc.osc_message_builder import OscMessageBuilder

from composer.score.reading import read_score
from player.inputs.beat import Beat
from player.inputs.events import Ask, Back, Begin, End, Silent, Wanted
from player.inputs.model import NO_MAP
from player.inputs.osc import ADDRESSES, BURST, FARTHEST_S, MOST_WAITING, PACKETS_A_S, Known, OscBinds, known_of
from player.inputs.osc_packets import tag_of

UNIX = 1_700_000_000.0
KNOWN = Known({"r.1": 0, "r.2": 1}, {"all": (0, 1)}, {"flick": (1,)}, ("the door",))


def packet(address, *arguments):
    builder = OscMessageBuilder(address)
    for value in arguments:
        builder.add_arg(value)
    return builder.build().dgram


def at(ahead_s, *packets):
    """A bundle for so many seconds from now."""
    body = b"".join(struct.pack(">i", len(one)) + one for one in packets)
    return b"#bundle\0" + struct.pack(">Q", tag_of(UNIX + ahead_s)) + body


@pytest.fixture
def osc():
    return OscBinds(NO_MAP, KNOWN)


def hear(osc, data, now_s=10.0):
    return osc.hear(data, now_s, UNIX)


def refused(osc):
    return {why: count for why, count in osc.refused.items() if count}


def test_every_fixed_address_means_what_the_table_says(osc):
    sent = {
        "/drawcord/fiber/NAME": (packet("/drawcord/fiber/r.2", 0.5), Wanted("osc", 10.0, (1,), 0.5)),
        "/drawcord/group/NAME": (packet("/drawcord/group/all", 0.25), Wanted("osc", 10.0, (0, 1), 0.25)),
        "/drawcord/phrase/NAME": (packet("/drawcord/phrase/flick", 0.5), None),
        "/drawcord/cue": (packet("/drawcord/cue", "the door"), Ask("osc", 10.0, "cue", "the door")),
        "/drawcord/pause": (packet("/drawcord/pause"), Ask("osc", 10.0, "pause")),
        "/drawcord/go_on": (packet("/drawcord/go_on"), Ask("osc", 10.0, "go_on")),
        "/drawcord/rest": (packet("/drawcord/rest"), Ask("osc", 10.0, "rest")),
        "/drawcord/vent": (packet("/drawcord/vent"), Ask("osc", 10.0, "vent")),
    }
    assert set(sent) == set(ADDRESSES)
    for data, wanted in sent.values():
        (event,) = hear(osc, data)
        if wanted is not None:
            assert event == wanted
    assert osc.taken == len(ADDRESSES)


def test_a_phrase_begins_on_those_that_play_it_with_or_without_a_velocity(osc):
    (loud,), (soft,) = hear(osc, packet("/drawcord/phrase/flick")), hear(osc, packet("/drawcord/phrase/flick", 0.25))
    assert (loud.phrase, loud.fibers, loud.scale, soft.scale) == ("flick", (1,), 1.0, 0.25)
    assert loud.key != soft.key


@pytest.mark.parametrize(
    ("data", "reason"),
    [
        (packet("/drawcord/arm"), "address"),
        (packet("/drawcord/state", "armed"), "address"),
        (packet("/reeds", 0.5), "address"),
        (packet("/drawcord/fiber/r.9", 0.5), "name"),
        (packet("/drawcord/fiber/r.*", 0.5), "name"),
        (packet("/drawcord/group/r.1", 0.5), "name"),
        (packet("/drawcord/phrase/flack"), "name"),
        (packet("/drawcord/cue", "the dor"), "name"),
        (packet("/drawcord/cue", 3), "type"),
        (packet("/drawcord/cue"), "type"),
        (packet("/drawcord/fiber/r.1"), "type"),
        (packet("/drawcord/fiber/r.1", 1), "type"),
        (packet("/drawcord/fiber/r.1", "0.5"), "type"),
        (packet("/drawcord/fiber/r.1", 0.5, 0.5), "type"),
        (packet("/drawcord/fiber/r.1", True), "type"),
        (packet("/drawcord/pause", 1.0), "type"),
        (packet("/drawcord/fiber/r.1", math.nan), "value"),
        (packet("/drawcord/fiber/r.1", math.inf), "value"),
        (packet("/drawcord/fiber/r.1", -math.inf), "value"),
        (packet("/drawcord/fiber/r.1", 1.001), "value"),
        (packet("/drawcord/fiber/r.1", -0.001), "value"),
        (b"/drawcord/fiber/r.1", "malformed"),
        (at(FARTHEST_S + 1.0, packet("/drawcord/pause")), "late"),
    ],
)
def test_what_is_wrong_changes_nothing_and_is_counted_by_its_reason(osc, data, reason):
    assert hear(osc, data) == []
    assert refused(osc) == {reason: 1}
    assert osc.tick(1000.0) == []


def test_nothing_that_can_be_sent_arms():
    """There is no event for it, whatever the address."""
    osc = OscBinds(NO_MAP, KNOWN)
    for address in ("/drawcord/arm", "/drawcord/armed", "/drawcord/play", "/drawcord/preflight", "/drawcord/go_on/arm"):
        assert hear(osc, packet(address)) == []
    assert all(what != "arm" for what in ADDRESSES)


def test_one_wrong_message_in_a_bundle_leaves_the_others(osc):
    events = hear(osc, at(-1.0, packet("/nowhere"), packet("/drawcord/pause")))
    assert events == [Ask("osc", 10.0, "pause")]
    assert refused(osc) == {"address": 1}


def test_time_tags_are_honoured_and_past_ones_are_for_now(osc):
    assert hear(osc, at(0.5, packet("/drawcord/fiber/r.1", 0.5))) == []
    assert hear(osc, at(0.25, packet("/drawcord/pause"))) == []
    assert osc.tick(10.2) == []
    assert [event.what for event in osc.tick(10.26)] == ["pause"]
    (event,) = osc.tick(10.6)
    assert (event.at_s, event.stroke) == (pytest.approx(10.5, abs=1e-6), 0.5)
    assert hear(osc, at(-5.0, packet("/drawcord/go_on"))) == [Ask("osc", 10.0, "go_on")]


def test_what_waits_is_bounded(osc):
    for _ in range(MOST_WAITING // 100 + 2):
        hear(osc, at(30.0, *[packet("/drawcord/pause")] * 100))
    assert osc.waiting <= MOST_WAITING
    assert osc.refused["full"] > 0


def test_a_stop_comes_through_with_a_wrong_clock_a_full_queue_and_in_a_flood(osc):
    assert hear(osc, at(3600.0, packet("/drawcord/vent"))) == [Ask("osc", 10.0, "vent")]
    for _ in range(int(BURST) + 50):
        hear(osc, packet("/drawcord/pause"))
    assert osc.refused["fast"] >= 50
    assert hear(osc, packet("/drawcord/vent")) == [Ask("osc", 10.0, "vent")]
    assert hear(osc, packet("/drawcord/rest")) == [Ask("osc", 10.0, "rest")]


def test_a_hundred_thousand_packets_in_a_second_are_thinned_to_the_rate(osc):
    data, taken = packet("/drawcord/fiber/r.1", 0.5), 0
    for number in range(100_000):
        taken += len(osc.hear(data, 10.0 + number * 1e-5, UNIX))
    assert taken == pytest.approx(BURST + PACKETS_A_S, abs=2)
    assert osc.refused["fast"] == 100_000 - taken


# the map -----------------------------------------------------------------------------------------

MAP = """
[[bind]]
osc = "/reeds"
fibers = "r.1-2"
low = 0.2
high = 0.6
[[bind]]
osc = "/hit"
phrase = "wave"
on = "r.3"
release = "rest"
quantise = "1"
[[bind]]
osc = "/next"
does = "next_cue"
"""


def test_binds_of_the_map_have_their_own_addresses(map_of):
    osc = OscBinds(map_of(MAP), KNOWN)
    (event,) = hear(osc, packet("/reeds", 0.5))
    assert event == Wanted("osc", 10.0, (0, 1), pytest.approx(0.4), "takes", 0)
    assert hear(osc, packet("/next")) == [Ask("osc", 10.0, "next_cue")]
    assert hear(osc, packet("/next", 0.0)) == []


def test_a_phrase_of_the_map_begins_on_the_beat_and_0_lets_it_go(map_of):
    osc = OscBinds(map_of(MAP), KNOWN)
    osc.beat = Beat(0.0, 9.75, 1.0)
    (begin,) = hear(osc, packet("/hit", 0.5))
    assert (begin.phrase, begin.fibers, begin.scale, begin.at_s) == ("wave", (2,), 0.5, pytest.approx(10.75))
    assert hear(osc, packet("/hit", 0.0), 11.0) == [End("osc", 11.0, begin.key, (2,), True)]
    assert hear(osc, packet("/hit", 0.0), 11.0) == []


def test_silence_brings_its_fibers_to_rest_where_the_map_says_so(map_of):
    osc = OscBinds(map_of(MAP, silence_s=1.0), KNOWN)
    hear(osc, packet("/reeds", 0.5), 10.0)
    (begin,) = hear(osc, packet("/hit", 0.5), 10.0)
    assert osc.tick(11.0) == []
    ended, silent = osc.tick(11.5)
    assert ended.key == begin.key
    assert silent == Silent("osc", 11.5, (0, 1, 2), "osc: nothing came for 1.5 s")
    assert osc.tick(20.0) == []
    assert hear(osc, packet("/reeds", 0.5), 21.0)[0] == Back("osc", 21.0)
    osc.let_go((1,))
    assert [event.fibers for event in osc.tick(23.0)] == [(0,)]


def test_the_names_of_a_score_are_known_with_the_fibers_that_play_its_phrases(make_rig):
    text = """rig bench.rig.toml
group pair = r.1, r.3
cue "up" at 1:1
phrase nod 2
  1 full
phrase lone 2
  1 full
section one at 1:1
  pair nod
  r.1 nod after 4 mirror
"""
    known = known_of(make_rig(4), read_score(text, "s"))
    assert known.groups == {"all": (0, 1, 2, 3), "pair": (0, 2)}
    assert known.phrases == {"nod": (0, 2, 3)}
    assert known.cues == ("up",)
    assert known_of(make_rig(2)).phrases == {}


@given(st.lists(st.binary(max_size=80), max_size=20))
def test_any_packets_leave_only_events_in_range(data):
    osc = OscBinds(NO_MAP, KNOWN)
    for number, one in enumerate(data):
        for prefix in (b"", b"/drawcord/fiber/r.1\0,f\0\0"):
            for event in osc.hear(prefix + one, float(number), UNIX):
                assert isinstance(event, Wanted | Begin | Ask)
                assert not isinstance(event, Wanted) or 0.0 <= event.stroke <= 1.0
