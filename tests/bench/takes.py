"""How fast a take is fitted, and with how few knots, in one run: 48 fibers of Estuary for ten minutes, at 200 Hz.

Once with eight faders, each over six neighbours, once with a fader for every fiber, on all cores: how much faster than it was
played, and what of that was the processors' (starts of the processes beside included); what else the machine does shows in the
distance of the two. And knots against those of an exact search over close places (on the first minute, where that can be waited
for).

Run: python tests/bench/takes.py [MINUTES [--exact]]
"""

import os
import platform
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))
sys.path.insert(0, str(Path(__file__).parents[1] / "player" / "takes"))

from hands import governed, hand

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.load import load_rig
from composer.score.tempo import TempoMap
from player.governor.governor import governor_of
from player.governor.sent import tracks_of
from player.takes.cores import Cores
from player.takes.fewest import fewest
from player.takes.moves import likely, moves_of
from player.takes.places import places_of
from player.takes.settling import settle

RIG = Path(__file__).parents[2] / "scores_demo" / "estuary.rig.toml"
TOLERANCE = 0.01


def main() -> None:
    """Print the figures."""
    minutes = float(sys.argv[1]) if len(sys.argv) > 1 else 10.0
    rig = load_rig(RIG)
    abilities = abilities_of(rig)
    fibers = len(rig.fibers)
    one = np.ones(1)
    tempo = TempoMap(0.0 * one, 0.0 * one, 2.0 * one, 0.0 * one, 0.0 * one, 0.0 * one, 4.0 * one)
    cores = f"{len(os.sched_getaffinity(0))} cores, load {os.getloadavg()[0]:.1f}"
    print(f"{platform.processor() or platform.machine()}, Python {platform.python_version()}, {cores}")
    for faders in (8, fibers):
        # With rests of up to 10 s coils stay within their duty, as in a rehearsal.
        lead = np.array([hand(60.0 * minutes, seed, rest_s=10.0) for seed in range(faders)])
        times, let = governed(rig, abilities, lead[np.arange(fibers) * faders // fibers])
        begin_cpu, begin = sum(os.times()[:4]), time.perf_counter()
        with Cores() as each:
            settled = settle(times, lambda f, let=let: let[f], rig, abilities, tempo, TOLERANCE, each=each)
            wall = time.perf_counter() - begin
        cpu = sum(os.times()[:4]) - begin_cpu
        print(
            f"{faders:2} faders, {fibers} fibers, {minutes:g} min: {wall:.1f} s ({cpu:.1f} s of the processors), "
            f"{60.0 * minutes / wall:.0f} times faster than played; {len(settled.voices)} voices, {settled.knots} knots, "
            f"{settled.knots / len(settled.voices) / minutes:.1f} a voice and minute; at worst "
            f"{settled.worst.max() * 100.0:.2f} % off, {len(settled.checked.snags)} snags"
        )
        rates = np.gradient(let, times, axis=1)
        was = check(tracks_of(governor_of(rig, abilities, 0.005), times, let.T, rates.T), rig, abilities)
        print(f"   what was let through has {len(was.snags)} snags itself")
        if "--exact" in sys.argv and faders == 8:
            exactly(settled, times, let, rig, abilities, tempo)


def exactly(settled, times, let, rig, abilities, tempo) -> None:
    """The first minute against one search over close places."""
    from player.takes.voices import leader_of, played_of

    some = times <= 60.0
    share = np.clip(let / abilities.stroke[:, None], 0.0, 1.0)[:, some]
    rows = [leader_of(voice) for voice in settled.voices]
    played = played_of(settled.voices, share[rows], np.zeros(len(rig.fibers)), abilities, 0.0, 0.005, TOLERANCE)
    again = settle(times[some], lambda f: let[f, some], rig, abilities, tempo, TOLERANCE)
    close = places_of(played, tempo, 1.0)
    watched = [close.time_s[close.first[k] : close.first[k + 1]] for k in range(len(rows))]
    begin = time.perf_counter()
    paths, breaks = fewest(close, moves_of(played, close, likely(played, close), watched))
    least = sum(path.moves for path in paths if path is not None)
    print(
        f"   first minute: {again.knots} knots against {least} of a search over {len(close.place)} places "
        f"({again.knots / least:.3f} times; {len(breaks)} breaks), which took {time.perf_counter() - begin:.0f} s"
    )


if __name__ == "__main__":
    main()
