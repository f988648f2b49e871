"""The governor: microseconds a tick for 48 and 4096 fibers, by what limits they have, over a copy of their strains.

Every kind of rig is played by hands that jump every twenty ticks, so that most ticks cut. The best and the middle tick are
printed; a machine that does something else meanwhile shows in the distance of the two.

    python tests/bench/governor.py
"""

import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from conftest import make_rig

from composer.limits.abilities import abilities_of
from composer.load import load_rig
from composer.rig.model import Rig
from player.governor import begin, govern, governor_of

DT_S, JUMP = 0.005, 20
TICKS = 100 if "--small" in sys.argv else 2000

LASTING = {"duty": 0.5, "duty_burst_s": 2.0, "max_hold_s": 2.0}
SCARCE = {"receiver_L": 0.05, "compressor_L_min": 10.0}


def rigs() -> dict[str, Rig]:
    make = make_rig.__wrapped__()
    demos = Path(__file__).parents[2] / "scores_demo"
    return {
        "Gannet, 12 modelled": load_rig(str(demos / "gannet.rig.toml")),
        "Estuary, 48 modelled": load_rig(str(demos / "estuary.rig.toml")),
        "48: rate, switching": make(48),
        "48: and duty, hold, scarce air": make(48, **LASTING, **SCARCE),
        "48: and acceleration": make(48, accel=20.0, **LASTING, **SCARCE),
        "4096: rate, switching": make(4096),
        "4096: and duty, hold, scarce air": make(4096, **LASTING, **SCARCE),
        "4096: and acceleration": make(4096, accel=20.0, **LASTING, **SCARCE),
    }


def main() -> None:
    random = np.random.default_rng(6)
    print(f"{'':36}{'best':>9}{'middle':>9}{'ticks cut':>11}{'over a copy':>13}")
    for name, rig in rigs().items():
        abilities = abilities_of(rig)
        governor = governor_of(rig, abilities)
        state, took, copied, cut = begin(governor), [], [], 0
        for tick in range(TICKS):
            if tick % JUMP == 0:
                wanted = random.uniform(-0.1, 1.1, governor.fibers) * abilities.stroke
            begun = time.perf_counter()
            state = govern(governor, state, wanted, DT_S)
            took.append(time.perf_counter() - begun)
            begun = time.perf_counter()
            wanted.copy()
            copied.append(time.perf_counter() - begun)
            cut += bool(state.cut.any())
        best, middle = np.percentile(took, [1, 50]) * 1e6
        print(f"{name:36}{best:6.0f} µs{middle:6.0f} µs{cut / TICKS:10.0%}{middle / (np.median(copied) * 1e6):12.0f}x")


if __name__ == "__main__":
    main()
