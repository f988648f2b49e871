"""A rig under hands that a test moves, in virtual time."""

from collections.abc import Callable, Iterator

import numpy as np
import pytest

from composer.limits.abilities import abilities_of
from composer.limits.check import check
from composer.load import made_from
from composer.score.reading import read_score
from player.engine.clock import VirtualClock
from player.engine.loop import Engine
from player.engine.transport import Cue
from player.governor import governor_of, tracks_of
from player.live.beneath import Followed, Nothing, Own
from player.live.repertoire import Repertoire
from player.live.source import Live
from player.outputs.sim import Sim

SCORE = """tempo 120
cue "middle" at 2:1 wait
phrase nod 2
  1 0.8 linear
  2 rest linear
phrase lift 4
  1 0.5 linear
  4 hold
section only at 1:1
  r.1 nod times 4 every 2
"""


class Hands:
    """Events of a test: given for a moment, handed over when it comes."""

    def __init__(self, clock):
        self._clock, self.waiting, self.present, self.beat = clock, [], None, None

    def do(self, *events) -> None:
        self.waiting += events

    def poll(self, now_s, present, beat):
        self.present, self.beat = present, beat
        due, self.waiting = self.waiting, []
        return due


class Bench:
    """An engine with a `Live` source on the simulated rig; `strain` and `view` of every tick are kept."""

    def __init__(self, rig, score: str | None = None, follower=None, hold: bool = False, armed: bool = True):
        self.rig, self.abilities = rig, abilities_of(rig)
        self.clock = VirtualClock()
        self.hands = Hands(self.clock)
        self.told: list[str] = []
        repertoire, cues = None, ()
        beneath = Nothing(len(rig.fibers))
        if score is not None:
            loaded = made_from(read_score(score, "bench.score"), rig)
            cues = tuple(Cue(cue.name, cue.seconds, cue.wait) for cue in loaded.cues)
            repertoire = Repertoire(loaded.score, rig, self.abilities)
            if follower is None:
                beneath = Own(loaded.tracks, self.abilities, cues, loaded.tempo)
            else:
                beneath = Followed(loaded.tracks, self.abilities, cues, loaded.tempo, follower, self.told.append)
        self.live = Live(
            rig, self.abilities, beneath, self.hands, self.clock.now, lambda *a: self.engine.ask(*a), self.told.append,
            repertoire, 0.01, hold, cues,
        )  # fmt: skip
        self.engine = Engine(
            rig, self.live, (Sim(rig, self.abilities, ("main",)),), self.clock, ahead_s=0.02, abilities=self.abilities
        )
        self.engine.preflight()
        self.live.latency_s = self.engine.ahead_s + self.live.lead_s
        self.strains, self.views, self.states, self.positions = [], [], [], []
        if armed:
            self.engine.arm()
        self._run = self.engine.run()

    def run(self, seconds: float) -> "Bench":
        """Let so much time pass."""
        until = self.clock.now() + seconds
        for status in self._run:
            self.told += status.told
            self.strains.append(self.live.strain)
            self.views.append(self.live.view)
            self.states.append(status.state)
            self.positions.append(status.position_s)
            if status.state not in ("playing", "paused", "resting"):
                self.live.idle()
            if self.clock.now() >= until:
                break
        return self

    def end(self) -> None:
        """Leave off: the engine vents what is not at rest, and garbage is collected again."""
        self._run.close()

    @property
    def share(self) -> np.ndarray:
        """Where all fibers are now, of their stroke."""
        return self.live.strain / self.abilities.stroke

    def snags(self) -> tuple:
        """What the check finds in all that was sent."""
        strains = np.array([np.zeros(len(self.rig.fibers)), *self.strains])
        rates = np.zeros_like(strains)
        tracks = tracks_of(governor_of(self.rig, self.abilities, 0.01), 0.005 * np.arange(len(strains)), strains, rates)
        return check(tracks, self.rig, self.abilities).snags


@pytest.fixture
def make_bench(make_rig) -> Iterator[Callable[..., Bench]]:
    """A maker of benches; keywords of the rig in `rig`."""

    made = []

    def make(count: int = 4, rig: dict | None = None, **more) -> Bench:
        made.append(Bench(make_rig(count, **(rig or {})), **more))
        return made[-1]

    yield make
    for bench in made:
        bench.end()


@pytest.fixture(scope="session")
def score() -> str:
    """Phrases nod and lift; r.1 nods four times; a cue "middle" at 2 s waits."""
    return SCORE
