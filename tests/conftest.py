"""What tests of every room share: values from outside, and small rigs made without a file."""

import json
import os
import shutil
import tempfile
import tomllib
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import HealthCheck, settings

from composer.fiber.mounting import Mounting, Supply, Valve
from composer.fiber.rated import Rated
from composer.rig.model import Driver, Fiber, FiberType, Rig

TESTS = Path(__file__).parent

# No test judges how long anything takes: a machine may be busy.
settings.register_profile("search", deadline=None, suppress_health_check=[HealthCheck.too_slow])
# The same inputs on every machine, so that a change is judged by what it changes; others are looked for on purpose.
settings.register_profile("drawcord", settings.get_profile("search"), derandomize=True)
settings.load_profile(os.environ.get("HYPOTHESIS", "drawcord"))


@pytest.fixture(scope="session", autouse=True)
def own_runs():
    """Runs of these tests listen in a folder of their own: no test vents what somebody else plays on this machine."""
    was = os.environ.get("XDG_RUNTIME_DIR")
    # Short, as a local socket's path may not be long.
    folder = os.environ["XDG_RUNTIME_DIR"] = tempfile.mkdtemp(prefix="runs-")
    yield folder
    shutil.rmtree(folder, ignore_errors=True)
    if was is None:
        del os.environ["XDG_RUNTIME_DIR"]
    else:
        os.environ["XDG_RUNTIME_DIR"] = was


@pytest.fixture(scope="session")
def outside() -> dict:
    """Every value from elsewhere, each with its source, from outside.toml."""
    return tomllib.loads((TESTS / "outside.toml").read_text())


@pytest.fixture(scope="session")
def make_rig() -> Callable[..., Rig]:
    """A maker of rigs of `count` rated fibers r.1 to r.N, one group `all`, on one board or several."""

    def make(
        count: int = 4,
        *,
        stroke: float = 0.3,
        fill: float = 0.6,
        exhaust: float = 0.3,
        accel: float | None = None,
        air_mL: float = 3.0,
        drive: str = "strain",
        max_hold_s: float = 0.0,
        boards: int = 1,
        duty: float = 1.0,
        duty_burst_s: float = 30.0,
        energised_while_holding: bool = False,
        max_switch_Hz: float = 50.0,
        receiver_L: float = 10.0,
        compressor_L_min: float = 40.0,
        min_pressure_kPa: float = 450.0,
        max_receiver_kPa: float = 800.0,
    ) -> Rig:
        supply = Supply(
            medium="air",
            pressure_kPa=400.0,
            min_pressure_kPa=min_pressure_kPa,
            receiver_L=receiver_L,
            max_receiver_kPa=max_receiver_kPa,
            compressor_L_min=compressor_L_min,
            polytropic=1.2,
            ambient_kPa=101.325,
            temperature_C=20.0,
        )
        valve = Valve(
            name="mini",
            C_dm3_s_bar=0.005,
            b=0.3,
            switch_ms=8.0,
            max_switch_Hz=max_switch_Hz,
            drive=drive,
            duty=duty,
            duty_burst_s=duty_burst_s,
            energised_while_holding=energised_while_holding,
        )
        make = Rated("contract", 400.0, stroke, fill, exhaust, air_mL, accel)
        kind = FiberType("drop", "rated", make, 1)
        each = -(-count // boards)
        names = ["main"] if boards == 1 else [f"board{n + 1}" for n in range(boards)]
        fibers = tuple(
            Fiber(
                name=f"r.{n + 1}",
                type=kind,
                mounting=Mounting(valve, supply, 2.0, 800.0, 1.5, 1, 1),
                driver=names[n // each],
                channel=n % each,
                at_m=(0.05 * n, 0.0, 0.0),
                toward=(0.0, 0.0, -1.0),
                mirror=count - 1 - n,
                max_hold_s=max_hold_s,
                line=1,
            )
            for n in range(count)
        )
        return Rig(
            name="Bench",
            file="bench.rig.toml",
            worn=False,
            supply=supply,
            fiber_types={"drop": kind},
            valve_types={"mini": valve},
            drivers=tuple(Driver(name, each) for name in names),
            fibers=fibers,
            groups={"all": tuple(range(count))},
            fingerprint=0x1234ABCD,
        )

    return make


SMALL_RIG = {
    "supply": {
        "medium": "air",
        "pressure_kPa": 400,
        "min_pressure_kPa": 450,
        "receiver_L": 10,
        "max_receiver_kPa": 800,
        "compressor_L_min": 40,
        "polytropic": 1.2,
    },
    "fiber_type.drop": {
        "kind": "rated",
        "direction": "contract",
        "rest_length_mm": 400,
        "stroke": 0.3,
        "fill_rate_per_s": 0.6,
        "exhaust_rate_per_s": 0.3,
        "air_mL": 3.0,
        "max_pressure_kPa": 400,
    },
    "valve_type.mini": {
        "C_dm3_s_bar": 0.005,
        "b": 0.3,
        "switch_ms": 8,
        "max_switch_Hz": 50,
        "drive": "strain",
        "duty": 1.0,
        "duty_burst_s": 30,
        "energised_while_holding": False,
    },
}
"""Tables and keys that every small rig has, as in a rig file."""


@pytest.fixture(scope="session")
def small_rig() -> Callable[..., str]:
    """A maker of rig files: a row of `count` rated fibers on each board, further keys of SMALL_RIG with other values.

    title: the rig's name; rows: name of each row and of its board; channels: of each board; tail: more text for its end
    """

    def make(
        *,
        title: str = "Bench",
        rows: tuple[tuple[str, str], ...] = (("r", "main"),),
        count: int = 4,
        channels: int = 4,
        tail: str = "",
        **changed: float | str | bool,
    ) -> str:
        lines: list[str] = []
        for table, keys in {"rig": {"name": title, "worn": False}, **SMALL_RIG}.items():
            lines += ["", f"[{table}]"] if lines else [f"[{table}]"]
            lines += [f"{key} = {json.dumps(changed.pop(key, value))}" for key, value in keys.items()]
        assert not changed, f"no such keys: {', '.join(changed)}"
        for _, board in rows:
            lines += ["", f"[driver.{board}]", f"channels = {channels}"]
        for name, board in rows:
            lines += [
                "",
                "[[fibers]]",
                f'name = "{name}"',
                f"count = {count}",
                'type = "drop"',
                f'driver = "{board}"',
                "tube_length_mm = 800",
                "load_N = 1.5",
                "step_m = [0.05, 0, 0]",
            ]
        return "\n".join(lines) + "\n" + tail

    return make
