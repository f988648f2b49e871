"""One fiber over time."""

import numpy as np
import pytest

from composer.limits.check import check
from composer.limits.snag import Snag
from composer.picture.strand.curve import knots_of, needs_and_has, reach, worded


@pytest.fixture(scope="module")
def piece(make_piece):
    return make_piece(until_s=2.1)


def test_knots_are_the_ends_of_moves(piece):
    knots = knots_of(piece.tracks, 2)
    assert knots.segment.tolist() == [7]
    assert (knots.from_s[0], knots.from_strain[0]) == (2.0, 0.0)
    assert (knots.at_s[0], knots.strain[0]) == (pytest.approx(2.1), pytest.approx(0.3))


def test_from_rest_a_fiber_of_constant_rate_reaches_its_rate_times_the_time(piece):
    ((when, low, high),) = reach(piece.abilities, 0, knots_of(piece.tracks, 0), np.array([0]))
    # It fills at 0.6 a second.
    assert high == pytest.approx(0.6 * (when - 2.0))
    assert low == pytest.approx(np.zeros_like(low))


def test_no_way_leads_beyond_the_stroke(make_piece):
    long = make_piece(until_s=8.0)
    ((when, _, high),) = reach(long.abilities, 0, knots_of(long.tracks, 0), np.array([0]))
    assert high.max() == pytest.approx(0.3)
    assert when[np.argmax(high >= 0.3 - 1e-9)] <= 2.0 + 0.5 + 0.2


def test_a_snag_is_told_in_the_fibers_own_units(piece):
    found = check(piece.tracks, piece.rig, piece.abilities).snags
    rate = next(snag for snag in found if snag.kind == "rate" and snag.fiber == 1)
    # 400 mm long, it fills at 0.6 a second: 240 mm/s.
    assert needs_and_has(rate, piece.abilities, 1).endswith("mm/s, can do 240")
    ((from_s, to_s, words),) = [one for one in worded(found, piece.abilities, 1) if "mm/s" in one[2]]
    assert (from_s, to_s) == (rate.from_s, rate.to_s)
    assert words.startswith("needs ")


@pytest.mark.parametrize(
    ("needs", "has", "words"),
    [
        (1.5, 0.6, "needs 600 mm/s, can do 240"),
        (0.6004, 0.6, "needs 240.2 mm/s, can do 240.0"),
        (0.06, 0.05, "needs 24.0 mm/s, can do 20.0"),
        (0.0060, 0.005, "needs 2.40 mm/s, can do 2.00"),
    ],
)
def test_numbers_have_as_many_digits_as_it_takes_to_tell_them_apart(piece, needs, has, words):
    assert needs_and_has(Snag("rate", 0, 0.0, 1.0, needs, has, "1/s", 1, 1), piece.abilities, 0) == words


@pytest.mark.parametrize(
    ("kind", "needs", "has", "words"),
    [
        ("stroke", 0.35, 0.3, "needs 140 mm, can do 120"),
        ("stroke", -0.05, 0.0, "goes 20.00 mm below rest"),
        ("hold", 5.0, 3.0, "needs 5.00 s held, it may hold 3.00"),
        ("duty", 5.0, 3.0, "needs 5.00 s of its coil, it bears 3.00"),
        ("switching", 5.0, 3.0, "needs 5.00 switches a second, its valve bears 3.00"),
        ("air", 5.0, 3.0, "needs 5.00 L of air, there are 3.00"),
    ],
)
def test_every_kind_of_snag_has_its_words(piece, kind, needs, has, words):
    assert needs_and_has(Snag(kind, 0, 0.0, 1.0, needs, has, "", 1, 1), piece.abilities, 0) == words
