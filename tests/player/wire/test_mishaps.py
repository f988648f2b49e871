from random import Random

import pytest

from composer.limits.abilities import abilities_of
from player.wire.messages import FAULTS
from player.wire.mishaps import MISHAPS
from player.wire.rules import Build
from player.wire.simulated import Bench

FRAMES = bytes([7, 8, 9, 0]) * 250
BUILD = Build("Bench", ("strain",) * 4, rig=5)


@pytest.mark.parametrize("name", MISHAPS)
def test_each_mishap_says_what_it_does_and_does_something(name, make_rig):
    mishap = MISHAPS[name]
    assert mishap.says
    rig = make_rig(count=2)
    bench = Bench(rig, abilities_of(rig), "main")
    bench.set_valves(0, [500, 500])
    mishap.bench(bench)
    does = (
        mishap.mute
        or mishap.echoes
        or mishap.room is not None
        or mishap.answers_after_s > 0.0
        or mishap.rate != 1.0
        or mishap.build(BUILD) != BUILD
        or (mishap.garble is not None and mishap.garble(FRAMES, Random(1)) != FRAMES)
        or mishap.strike in ("mute", "reset", "jump", "misread")
        or (mishap.strike == "tell" and mishap.tells[0] in FAULTS)
        or (mishap.strike == "bench" and (bench.stuck or bench.railed or bench.leaking or bench.low_supply))
    )
    assert does


def test_one_byte_in_a_hundred_is_about_one_in_a_hundred():
    garbled = MISHAPS["garbles"].garble(bytes(100_000), Random(1))
    assert 850 < sum(byte != 0 for byte in garbled) < 1150
    assert 850 < 100_000 - len(MISHAPS["loses"].garble(bytes(100_000), Random(1))) < 1150
    assert 0 not in MISHAPS["noise"].garble(bytes(1000), Random(1))


def test_frames_that_are_cut_off_lose_their_end_and_now_and_then_the_zero_too():
    frames = b"".join(bytes([*range(1, 20), 0]) for _ in range(2000))
    cut = MISHAPS["cuts"].garble(frames, Random(1))
    pieces = cut.split(b"\0")[:-1]
    whole = bytes(range(1, 20))
    lasting = [piece for piece in pieces if piece != whole]
    assert 60 < len(lasting) < 140
    assert any(piece in (whole[:n] for n in range(19)) for piece in lasting), "an end is lost"
    assert any(len(piece) > 19 for piece in lasting), "a frame runs into the next"


def test_a_board_of_another_rig_is_of_another_rig():
    assert MISHAPS["wrong-rig"].build(BUILD).rig not in (None, BUILD.rig)
