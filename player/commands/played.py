"""What `play` is given, made ready to be played: a score, a play file or a recording, each with the rig it is for."""

import os
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from composer.commands.places import place_of
from composer.faults import Faults, fault, nearest
from composer.files import read_bytes
from composer.limits.abilities import Abilities, abilities_of
from composer.rig.model import Rig
from composer.score.tempo import TempoMap
from composer.tracks import Tracks
from composer.warp import UNWARPED, Warp
from player.engine.source import Source
from player.engine.transport import Cue
from player.outputs.recording import LARGEST_BYTES, MAGIC, Recording

Array = NDArray[np.float64]

ZIP = b"PK\x03\x04"
"""The first bytes of a play file, which is a NumPy .npz."""


@dataclass(frozen=True, slots=True, eq=False)
class Played:
    """Something to play: `tracks` with `tempo`, `warp` and `cues` (instants as played), or a `recording`.

    used: further files that it was read from
    """

    path: str
    kind: str
    title: str
    rig: Rig
    abilities: Abilities
    tracks: Tracks | None = None
    tempo: TempoMap | None = None
    warp: Warp = UNWARPED
    cues: tuple[Cue, ...] = ()
    recording: Recording | None = None
    used: tuple[str, ...] = ()

    @property
    def names(self) -> tuple[str, ...]:
        """The fibers' names, in the rig's order."""
        return tuple(fiber.name for fiber in self.rig.fibers)

    def say_place(self, position_s: float) -> str:
        """Bar and count at an instant as played; seconds where there are no bars."""
        if self.tempo is None:
            return f"{position_s:.1f}s"
        return self.tempo.say_place(self.warp.was(position_s))

    def seconds_of(self, text: str) -> float:
        """The instant of a cue's name or a place such as 5:1 or 12.4s. Raises Faults."""
        for cue in self.cues:
            if cue.name == text:
                return cue.at_s
        where = f"--from {text}"
        if self.tempo is None:
            raise fault(where, "a recording is played from its first set, as it does not say what came before")
        place = place_of(text, where)
        if place is None:
            known = [cue.name for cue in self.cues]
            listed = "; the cues are " + ", ".join(f'"{name}"' for name in known[:12]) if known else "; it has no cues"
            raise fault(where, f"no cue of that name{listed}", "a cue, or a place such as 5:1 or 12.4s", nearest(text, known))
        at = self.warp.now(float(self.tempo.seconds(self.tempo.counts_of(place))))
        if self.tracks is not None and at > self.tracks.duration_s:
            raise fault(where, f"the score ends before, at {self.say_place(self.tracks.duration_s)}")
        return at

    def source(self) -> Source:
        """The source for an engine."""
        if self.recording is not None:
            return _playback(self.recording, self.rig, self.abilities)
        from player.engine.source import Driven

        assert self.tracks is not None
        return Driven(self.rig, self.abilities, self.tracks, self.cues)


def load_played(path: str, rig_path: str | None, mend: bool = False) -> Played:
    """Whatever the file is, by its first bytes; `rig_path` stands in for the rig that it names, `mend` retimes a score.

    Raises:
        Faults: what is wrong with the file, or with the call.
        NotMended: the score cannot be retimed.
    """
    start = _first_bytes(path)
    if mend and start.startswith((MAGIC, ZIP[:4])):
        raise fault(path, "--retime mends scores; this is a file made for playing", hint="retime the score that it came from")
    if start.startswith(MAGIC):
        return _recording(path, rig_path)
    if start.startswith(ZIP):
        return _play_file(path, rig_path)
    return _score(path, rig_path, mend)


def _first_bytes(path: str) -> bytes:
    """The first bytes of an ordinary file, none of anything else: whoever reads it whole says what is wrong with it."""
    try:
        if not os.path.isfile(path):
            return b""
        with open(path, "rb") as file:
            return file.read(len(MAGIC))
    except (OSError, ValueError):
        return b""


def _score(path: str, rig_path: str | None, mend: bool) -> Played:
    from composer.load import load_rig, load_score

    loaded = load_score(path, None if rig_path is None else load_rig(rig_path))
    tracks, warp = loaded.tracks, UNWARPED
    if mend:
        from player.commands.mending import mended

        tracks, was_s, now_s = mended(loaded)
        warp = Warp(was_s, now_s)
    cues = tuple(Cue(cue.name, warp.now(cue.seconds), cue.wait) for cue in loaded.cues)
    title = loaded.score.title or os.path.basename(path)
    return Played(
        path, "score", title, loaded.rig, loaded.abilities, tracks, loaded.tempo, warp, cues, used=tuple(loaded.score.lines)
    )


def _play_file(path: str, rig_path: str | None) -> Played:
    from composer.play_file import read_play

    play = read_play(path)
    rig = _rig(path, rig_path or play.rig_path)
    if rig.fingerprint != play.fingerprint:
        raise _another_rig(path, "retimed", play.fingerprint, rig)
    if play.fibers != tuple(fiber.name for fiber in rig.fibers):
        raise fault(path, f"its fibers are not those of {rig.file}", hint="retime the score again for this rig")
    cues = tuple(Cue(cue.name, cue.seconds, cue.wait) for cue in play.cues)
    warp = Warp(play.warp_was_s, play.warp_now_s) if len(play.warp_was_s) else UNWARPED
    title = play.title or os.path.basename(path)
    return Played(path, "play file", title, rig, abilities_of(rig), play.tracks, play.tempo, warp, cues)


def _recording(path: str, rig_path: str | None) -> Played:
    from player.outputs.recording import read

    found = read(read_bytes(path, LARGEST_BYTES), path)
    rig = _rig(path, rig_path or (os.path.join(os.path.dirname(path), found.rig_path) if found.rig_path else ""))
    if rig.fingerprint != found.fingerprint:
        raise _another_rig(path, "recorded", found.fingerprint, rig)
    channels = {driver.name: driver.channels for driver in rig.drivers}
    if any(channels.get(name) != count for name, count in found.drivers):
        raise fault(path, f"its drivers are not those of {rig.file}", hint="record it again with this rig")
    return Played(path, "recording", os.path.basename(path), rig, abilities_of(rig), recording=found)


def _rig(path: str, rig_path: str) -> Rig:
    """The rig that a file made for playing names, or that stands in for it."""
    from composer.load import load_rig

    if not os.path.isfile(rig_path):
        raise fault(path, f"its rig file {rig_path} is not there", hint="say where the rig file is with --rig RIG")
    return load_rig(rig_path)


def _another_rig(path: str, how: str, fingerprint: int, rig: Rig) -> Faults:
    found = f"this was {how} for a rig with the fingerprint {fingerprint:08x}; {rig.file} has {rig.fingerprint:08x}"
    hint = f"play it with the rig file that it was {how} for (--rig RIG), or make it again for this one"
    return fault(path, found, hint=hint)


def _playback(recording: Recording, rig: Rig, abilities: Abilities) -> Source:
    from player.engine.playback import Playback
    from player.outputs.file import places_of
    from player.wire.values import from_wire, is_valve

    place = places_of(rig, recording.drivers)
    valve = is_valve([fiber.mounting.valve.drive for fiber in rig.fibers])
    numbers = np.where(valve, 32768, 0).astype(np.uint16)[None].repeat(len(recording.time_s), axis=0)
    numbers[:, place >= 0] = recording.values[:, place[place >= 0]]
    return Playback(rig, abilities, recording.time_s, from_wire(numbers, valve), at_rest=recording.ended == "rest")
