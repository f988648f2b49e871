import json

import pytest

from composer.limits.abilities import abilities_of
from composer.report.rig import as_json, as_text, name_of, runs_of
from composer.rig.reading import read_rig

from ..fiber.makes import CORD, FOLD
from ..fiber.rigs import rig_of, table

DROP = """
[fiber_type.drop]
kind = "rated"
direction = "contract"
rest_length_mm = 400
stroke = 0.3
fill_rate_per_s = 0.6
exhaust_rate_per_s = 0.3
air_mL = 3
"""


@pytest.fixture(scope="module")
def rig():
    text = rig_of("contractile", CORD, count=4) + table("fold", "bending", FOLD) + DROP
    text += '\n[[fibers]]\nname = "far"\ncount = 2\nfirst_channel = 4\ntype = "one"\n'
    text += "tube_length_mm = 4000\ntube_bore_mm = 0.8\nload_N = 1.5\n"
    text += '\n[[fiber]]\nname = "fold"\ntype = "fold"\nchannel = 6\n\n[[fiber]]\nname = "drop"\ntype = "drop"\nchannel = 7\n'
    return read_rig(text, "bench.rig.toml")


GOLDEN = """\
bench.rig.toml: Bench, 8 fibers, fingerprint {fingerprint}
supply: air at 400 kPa, receiver 10 L from 800 down to 450 kPa, compressor 40 L/min; strokes and rates are promised at 400 kPa

fibers    type  valve  channel  stroke            force  fill  exhaust   air
                                     %                N     s        s    mL
reed.1-4  one   mini       0-3    24.6   98.4 mm   29.0  1.64     2.63  34.0
far.1-2   one   mini       4-5    24.6   98.4 mm   29.0  1.64     2.94  30.4
fold      fold  mini         6    23.6      360°   10.3  0.09     0.76   2.2
drop      drop  mini         7    30.0  120.0 mm      -  0.50     1.00   3.0

fill, exhaust: a full stroke as fast as it goes; force: at rest, at full pressure; air: of one fill, as free air (ANR)
one, fold: from their make, as mounted. The last 2 % of stroke on either way keep the rate from before:
exhaust below 2 % of stroke, fill above 98 %, where the pressure that drives the flow dies away"""


def test_the_table_has_a_row_for_each_run_of_like_fibers(rig):
    said = as_text("bench.rig.toml", rig, abilities_of(rig))
    assert said == GOLDEN.format(fingerprint=f"{rig.fingerprint:08x}")


def test_runs_are_named_as_a_score_would_name_them(rig):
    assert [name_of(rig, run) for run in runs_of(rig, abilities_of(rig))] == ["reed.1-4", "far.1-2", "fold", "drop"]


def test_a_gap_in_the_channels_ends_a_run():
    text = rig_of("contractile", CORD, count=2) + '\n[[fiber]]\nname = "reed.3"\ntype = "one"\nchannel = 5\nload_N = 1.5\n'
    rig = read_rig(text, "f")
    assert [name_of(rig, run) for run in runs_of(rig, abilities_of(rig))] == ["reed.1-2", "reed.3"]


def test_the_channels_of_several_boards_are_told_with_their_boards():
    text = rig_of("contractile", CORD, 'driver = "left"\nload_N = 1').replace(
        "[[fibers]]", "[driver.left]\nchannels = 4\n[driver.right]\nchannels = 4\n\n[[fibers]]"
    )
    rig = read_rig(text, "f")
    assert "left 0" in as_text("f", rig, abilities_of(rig))


def test_json_has_the_keys_that_programs_read(rig):
    abilities = abilities_of(rig)
    report = as_json("bench.rig.toml", rig, abilities)
    assert list(report) == ["rig", "fingerprint", "fibers"]
    assert report["fingerprint"] == f"{rig.fingerprint:08x}"
    assert len(report["fibers"]) == 8
    first, last = report["fibers"][0], report["fibers"][-1]
    assert list(first) == ["name", "type", "valve", "channel", "stroke", "stroke_mm", "force_N", "air_L", "rates"]
    assert (first["name"], first["type"], first["valve"], first["channel"]) == ("reed.1", "one", "mini", 0)
    assert first["stroke_mm"] == pytest.approx(400.0 * first["stroke"])
    assert first["rates"][0][0] == 0.0
    assert first["rates"][-1][0] == first["stroke"]
    assert len(first["rates"]) >= 64
    assert first["rates"][10][1:] == pytest.approx([abilities.fill[0, 10], abilities.exhaust[0, 10]])
    assert last["force_N"] is None
    assert last["rates"] == [[0.0, 0.6, 0.3], [0.3, 0.6, 0.3]]
    assert last["air_L"] == pytest.approx(0.003)
    json.dumps(report, allow_nan=False)


def test_a_rig_of_rated_fibers_says_nothing_of_held_rates(make_rig):
    rig = make_rig(3)
    assert "2 %" not in as_text("bench.rig.toml", rig, abilities_of(rig))


def test_water_is_told_as_water():
    rig = read_rig(rig_of("contractile", CORD, medium="water"), "f")
    said = as_text("f", rig, abilities_of(rig))
    assert "supply: water at 400 kPa, pump 40 L/min" in said
    assert "air: the water of one fill" in said
