"""The governor: microseconds a tick for 48 and 4096 fibers, by what limits they have, over a copy of their strains.

Every kind of rig is played by hands that jump every twenty ticks, so that most ticks cut. The same ticks are taken several
times, and of each the least counts, in time of this thread's own: what else the machine does is left out as far as may be.
Printed are the best, the middle and the mean of the ticks.

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

DT_S, JUMP, REPEATS = 0.005, 20, 5
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
    print(f"{'':36}{'best':>9}{'middle':>9}{'mean':>9}{'ticks cut':>11}{'over a copy':>13}")
    for name, rig in rigs().items():
        abilities = abilities_of(rig)
        governor = governor_of(rig, abilities)
        took = np.full((REPEATS, TICKS), np.inf)
        copied, cut = np.empty(TICKS), 0
        for repeat in range(REPEATS):
            state, random = begin(governor), np.random.default_rng(6)
            for tick in range(TICKS):
                if tick % JUMP == 0:
                    wanted = random.uniform(-0.1, 1.1, governor.fibers) * abilities.stroke
                begun = time.thread_time()
                state = govern(governor, state, wanted, DT_S)
                took[repeat, tick] = time.thread_time() - begun
                begun = time.thread_time()
                wanted.copy()
                copied[tick] = time.thread_time() - begun
                cut += bool(state.cut.any())
        least = took.min(axis=0) * 1e6
        best, middle = np.percentile(least, [1, 50])
        print(
            f"{name:36}{best:6.0f} µs{middle:6.0f} µs{least.mean():6.0f} µs{cut / TICKS / REPEATS:10.0%}"
            f"{middle / (np.median(copied) * 1e6):12.0f}x",
            flush=True,
        )


if __name__ == "__main__":
    main()
