"""What a living cloth shows."""

from dataclasses import replace

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.air import use
from composer.limits.check import check
from composer.picture.cloth.weave import duty_lane, lanes_of, stretches, supply_lane


@pytest.fixture(scope="module")
def scarce(make_piece, make_rig):
    """A piece on a rig whose compressor gives next to nothing."""
    rig = make_rig(8, compressor_L_min=0.1, receiver_L=1.0)
    return replace(make_piece(count=8), rig=rig, abilities=abilities_of(rig))


def test_the_supply_lane_falls_as_low_as_the_check_says(scarce):
    piece = scarce
    found = check(piece.tracks, piece.rig, piece.abilities)
    lane = supply_lane(piece.rig, piece.abilities, piece.tracks, np.linspace(0.0, 8.0, 101))
    assert found.lowest_kPa < piece.rig.supply.max_receiver_kPa
    assert lane.values.min() == pytest.approx(found.lowest_kPa, abs=0.05)
    assert (lane.limit, lane.supply) == (piece.rig.supply.min_pressure_kPa, True)


def test_what_a_check_knows_of_the_air_makes_the_same_lanes(scarce):
    piece = scarce
    asked = use(piece.tracks, piece.rig.supply, piece.abilities).asked
    known, anew = (lanes_of(piece.rig, piece.abilities, piece.tracks, 50, one) for one in (asked, None))
    assert all(np.array_equal(a.values, b.values) for a, b in zip(known, anew, strict=True))


def test_a_dip_shorter_than_a_column_is_still_in_the_lane(scarce):
    piece = scarce
    fine, coarse = (supply_lane(piece.rig, piece.abilities, piece.tracks, np.linspace(0.0, 8.0, n)) for n in (2001, 4))
    assert coarse.values.min() == pytest.approx(fine.values.min(), abs=0.05)


def test_a_coil_that_uses_all_its_allowance_stands_at_its_limit(make_piece, make_rig):
    piece = make_piece(count=4)
    # Two seconds of filling at duty 0.5 take 1 s of allowance: all of it.
    rig = make_rig(4, duty=0.5, duty_burst_s=1.0)
    lane = duty_lane(rig, abilities_of(rig), piece.tracks, np.linspace(0.0, 8.0, 81))
    assert lane.values.max() == pytest.approx(100.0, abs=0.5)
    assert lane.values[:19].max() == 0.0


def test_coils_that_may_stay_on_use_nothing(make_piece):
    piece = make_piece(count=4)
    assert lanes_of(piece.rig, piece.abilities, piece.tracks, 50)[1].values.max() == 0.0


def test_snags_keep_their_order(make_piece):
    piece = make_piece(until_s=2.1)
    found = check(piece.tracks, piece.rig, piece.abilities).snags
    assert len(found) > 0
    assert [(one.fiber, one.from_s, one.to_s) for one in stretches(found)] == [(s.fiber, s.from_s, s.to_s) for s in found]
