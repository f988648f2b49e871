"""A score retimed with all that it says itself."""

import numpy as np
import pytest

from composer.load import load_score
from composer.retime.choices import choices_of
from composer.retime.retiming import retime
from composer.retime.whole_score import keep_of, retime_score

RIG = """\
[rig]
name = "Bench"
[supply]
pressure_kPa = 300
min_pressure_kPa = 150
receiver_L = 500
max_receiver_kPa = 800
compressor_L_min = 5000
[fiber_type.cord]
kind = "rated"
direction = "contract"
stroke = 0.3
fill_rate_per_s = 0.2
exhaust_rate_per_s = 0.1
rest_length_mm = 400
air_mL = 18
[valve_type.mini]
drive = "pressure"
C_dm3_s_bar = 0.1
[driver.a]
channels = 2
[[fibers]]
name = "r"
count = 2
type = "cord"
valve = "mini"
driver = "a"
"""
SCORE = """\
rig bench.rig.toml
tempo 60
{keep}
pin 3:1 within 0.1s
phrase up 4
  2    full   linear over 1
  4    rest   linear
section one at 1:1 {own}
  r.1  up firm 5
  r.2  up after 1
  r.2  up after 9
"""


@pytest.fixture
def loaded(tmp_path):
    def load(keep="", own=""):
        (tmp_path / "bench.rig.toml").write_text(RIG)
        (tmp_path / "bench.score").write_text(SCORE.format(keep=keep, own=own))
        return load_score(str(tmp_path / "bench.score"))

    return load


@pytest.mark.parametrize("keep", ["", "keep rhythm", "keep clock"])
def test_pins_give_firmness_and_what_is_kept_come_from_the_score(loaded, keep):
    made = loaded(keep)
    firm, rhythm = choices_of(made.score, made.tracks, keep_of(made.score))
    by_hand = retime(
        made.tracks,
        made.abilities,
        made.rig,
        made.pins_s,
        keep_of(made.score),
        give_s=made.pins_give_s,
        firm=firm,
        rhythm=rhythm,
    )
    found = retime_score(made)
    assert found.cost == by_hand.cost > 0.0
    np.testing.assert_array_equal(found.tracks.time_s, by_hand.tracks.time_s)


def test_what_is_asked_for_goes_before_what_the_score_says(loaded):
    made = loaded("keep rhythm")
    assert keep_of(made.score) == "rhythm" and keep_of(made.score, "clock") == "clock" and keep_of(loaded().score) == "clock"
    assert retime_score(made, "clock").cost == pytest.approx(retime_score(loaded("keep clock")).cost)


def test_further_wishes_are_handed_on(loaded):
    heard = []
    retime_score(loaded(), tell=heard.append)
    assert heard
