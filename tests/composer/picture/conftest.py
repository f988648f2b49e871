"""A small piece to be drawn."""

import os

# No picture and no window needs a screen here.
os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.picture.bands import bands_of
from composer.picture.cloth.weave import Weave, lanes_of, stretches
from composer.picture.material import Piece, run, scene_of
from composer.picture.scene import CueMark
from composer.score.tempo import TempoMap
from composer.shapes import PROGRESS
from composer.tracks import HOLD, MOVE, Tracks


@pytest.fixture(scope="session")
def make_piece(make_rig):
    """A maker of pieces of `count` fibers that all rise from 2 s to `until_s` and stay, 8 s in all."""

    def make(count=4, until_s=4.0):
        zero = np.zeros(1)
        curve = np.array([np.zeros(6), 0.3 * PROGRESS["smooth"], 0.3 * np.eye(6)[0]])
        tracks = Tracks(
            np.arange(count + 1) * 3,
            np.tile([0.0, 2.0, until_s], count),
            np.tile(curve, (count, 1)),
            np.tile(np.array([HOLD, MOVE, HOLD], np.int8), count),
            *(np.zeros(3 * count, dtype) for dtype in (np.int8, np.int32, np.int32)),
            8.0,
        )
        rig = make_rig(count)
        bars = TempoMap(zero, zero, np.ones(1), zero, zero, zero, np.array([4.0]))
        return Piece(
            "Bench", rig, abilities_of(rig), tracks, bars, (4.0,), (CueMark("lift", 2.0, False), CueMark("stay", 6.0, True))
        )

    return make


@pytest.fixture(scope="session")
def make_scene(make_piece):
    """A maker of scenes of such pieces."""

    def make(columns=400, **how):
        piece = make_piece(**how)
        return scene_of(piece, run(piece, columns, 100.0))

    return make


@pytest.fixture(scope="session")
def make_weave(make_piece):
    """A maker of weaves of such pieces: with the snags that their check finds, and both lanes."""

    def make(**how):
        piece = make_piece(**how)
        found = check(piece.tracks, piece.rig, piece.abilities).snags
        return Weave(
            piece.tracks, piece.abilities, bands_of(piece.rig), piece.names, piece.tempo, stretches(found), piece.pins_s,
            piece.cues, lanes_of(piece.rig, piece.abilities, piece.tracks, 400),
        )  # fmt: skip

    return make
