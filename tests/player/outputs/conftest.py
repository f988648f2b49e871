"""The simulated board in C: compiled once, run with options."""

import csv
from contextlib import contextmanager

import pytest

from composer.limits.abilities import abilities_of
from player.outputs.portable_board import PortableBoard, compiled
from player.wire.device_c.plant import plant_text
from player.wire.rules import Build

from .portable import Talk


@pytest.fixture(scope="module")
def cache(tmp_path_factory):
    return tmp_path_factory.mktemp("cache")


@pytest.fixture(scope="module")
def program(cache):
    return compiled(4, cache)


@pytest.fixture
def board(program, make_rig, tmp_path):
    """A board with options; its Talk, and rows() of its log once it has ended."""
    running = []

    @contextmanager
    def run(*options, **rig):
        rig = make_rig(4, **rig)
        text = plant_text(rig, abilities_of(rig), "main", Build("Bench", ("strain",) * 4, rig=rig.fingerprint))
        made = PortableBoard(program, text, str(tmp_path / "log.csv"), options)
        running.append(made)
        yield made, Talk(made.path)
        made.stop()
        assert made.run() == 0

    yield run
    for made in running:
        made.stop()


@pytest.fixture
def rows(tmp_path):
    return lambda: list(csv.DictReader((tmp_path / "log.csv").read_text().splitlines()))
