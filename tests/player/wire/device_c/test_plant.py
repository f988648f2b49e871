"""The fibers behind the simulated board in C, against the simulated rig."""

import subprocess
from pathlib import Path

import numpy as np
import pytest

from composer.drive.inverse import Inverse
from composer.limits.abilities import abilities_of
from composer.load import load_rig
from composer.simulate.rig import SimulatedRig
from player.wire.device_c.plant import POINTS, STEP_S, plant_text
from player.wire.mishaps import MISHAPS
from player.wire.rules import Build
from player.wire.simulated import Bench
from player.wire.values import FULL, SHUT, from_wire

SOURCES = Path(__file__).parents[4] / "player" / "wire" / "device_c"
ESTUARY = Path(__file__).parents[4] / "scores_demo" / "estuary.rig.toml"


@pytest.fixture(scope="module")
def plant(compiler, tmp_path_factory):
    """Moves a rig's fibers in C: (text, [(channel, number, steps)]) to (supply kPa, share of stroke (channels,)) after each."""
    folder = tmp_path_factory.mktemp("plant")
    made = folder / "plant"
    call = [compiler, "-std=c99", "-pedantic", "-Wall", "-Wextra", "-Werror", "-O1", "-fsanitize=address,undefined"]
    call += ["-fno-sanitize-recover=all", "-DDC_CHANNELS=48", f"-I{SOURCES}", str(SOURCES / "posix" / "plant.c")]
    call += [str(Path(__file__).parent / "plant_driver.c"), "-o", str(made)]
    done = subprocess.run(call, capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr

    def move(text, deeds):
        file = folder / "parameters"
        file.write_text(text)
        words = "\n".join(f"{channel} {number} {steps}" for channel, number, steps in deeds)
        done = subprocess.run([made, str(file)], input=words, capture_output=True, text=True, timeout=60)
        if done.returncode:
            return done.stdout.strip() or done.stderr
        rows = [np.array(line.split(), dtype=float) for line in done.stdout.splitlines()]
        return [(row[0] / 10.0, row[1:] / FULL) for row in rows]

    return move


def told(rig, driver="main", mishap=None):
    abilities = abilities_of(rig)
    build = Build("Bench", Bench(rig, abilities, driver).drives, rig=rig.fingerprint)
    return plant_text(rig, abilities, driver, MISHAPS[mishap].build(build) if mishap else build)


@pytest.mark.parametrize("drive", ["pressure", "strain", "valve"])
def test_a_rated_fiber_moves_as_in_the_simulated_rig_by_every_drive(plant, make_rig, drive):
    rig = make_rig(2, drive=drive)
    deeds = [(0, 65535, 100), (1, 40000, 60), (0, SHUT, 50), (0, 0, 120), (1, 0, 300)]
    simulated, numbers = SimulatedRig(rig, abilities_of(rig)), np.array([0, 0])
    valve = np.array([drive == "valve"] * 2)
    for (supply, share), (channel, number, steps) in zip(plant(told(rig), deeds), deeds, strict=True):
        numbers[channel] = number
        for _ in range(steps):
            simulated.step(STEP_S, from_wire(numbers, valve))
        # One step of the fastest rate, and the sensor's own steps.
        assert share * 0.3 == pytest.approx(simulated.strain, abs=0.6 * STEP_S + 1e-5)
        assert supply == pytest.approx(simulated.supply_kPa, abs=0.2)


def test_a_modelled_fiber_comes_to_stand_where_its_set_point_holds_it_and_never_faster_than_it_can(plant):
    rig = load_rig(str(ESTUARY))
    abilities = abilities_of(rig)
    wanted = np.linspace(0.0, 1.0, 5)[1:] * abilities.stroke[:, None]
    sent = Inverse(rig, abilities, on=False).commands(wanted, wanted, wanted, STEP_S)
    for fiber in (0, 30, 40):
        for goal, share in zip(wanted[fiber], sent[fiber], strict=True):
            number = round(float(share) * FULL)
            rows = plant(told(rig, "curtain"), [(fiber, number, 5)] * 300)
            strains = np.array([share[fiber] for _, share in rows]) * abilities.stroke[fiber]
            assert strains[-1] == pytest.approx(goal, abs=0.002 * abilities.stroke[fiber])
            fastest = abilities.fill[abilities.which[fiber]].max()
            assert np.diff(strains, prepend=0.0).max() <= fastest * 5 * STEP_S * 1.001 + 2e-5


def test_a_fiber_waits_for_the_response_of_its_valve(plant, make_rig):
    text = told(make_rig(1))
    assert text.splitlines()[3].split()[:4] == ["fiber", "0", "1", "4"]
    shares = [share[0] for _, share in plant(text, [(0, 65535, 1)] * 8)]
    assert [share > 0.0 for share in shares] == [False] * 4 + [True] * 4


def test_a_board_with_a_channel_less_has_a_fiber_less(make_rig):
    whole, less = told(make_rig(4)), told(make_rig(4), mishap="few-channels")
    assert (whole.count("fiber"), less.count("fiber")) == (4, 3)
    assert less.splitlines()[1].split()[:2] == ["board", "3"]


def test_a_file_is_refused_that_is_no_whole_plant(plant, make_rig):
    text = told(make_rig(2))
    lines = text.splitlines()
    assert len(lines) == 3 + 2 * (1 + POINTS)
    for wrong in ("", "plant 2", "\n".join(lines[:1]), "\n".join(lines[:2]), "\n".join(lines[:-1]), text + "fibre 0",
                  text.replace("board 2", "board 49"), text.replace("board 2", "board 0"), text.replace("fiber 1", "fiber 2"),
                  text.replace("fiber 1 1", "fiber 1 3"), text.replace("fiber 1 1 4", "fiber 1 1 256")):  # fmt: skip
        assert isinstance(plant(wrong, [(0, 0, 1)]), str), wrong[:80]
    assert not isinstance(plant(text, [(0, 0, 1)]), str)
