"""Strain in real units."""

from dataclasses import replace

import numpy as np

from composer.picture.units import in_words, unit_of


def test_strain_is_millimetres_on_a_straight_fiber_and_degrees_on_one_that_turns(make_piece):
    piece = make_piece(until_s=2.1)
    assert unit_of(piece.abilities, 0) == (400.0, "mm")
    assert in_words(piece.abilities, 0, 0.15) == "60.0 mm, 50 % of stroke"
    turning = replace(piece.abilities, turn_deg=np.full(4, 300.0))
    assert in_words(turning, 0, 0.15) == "45.0°, 50 % of stroke"
