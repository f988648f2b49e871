"""What a command is given to be seen, a score or a play file, as a piece."""

import os

from composer.faults import Faults, fault
from composer.limits.abilities import abilities_of
from composer.load import load_rig, load_score
from composer.picture.bars import RetimedBars
from composer.picture.material import Piece
from composer.picture.scene import CueMark
from composer.play_file import Play, read_play
from composer.rig.model import Rig

ZIP = b"PK\x03\x04"
"""The first bytes of a play file, which is a NumPy .npz."""


def load_piece(path: str, rig_path: str | None = None) -> Piece:
    """The piece of a score or a play file; `rig_path` stands in for the rig that it names. Raises Faults."""
    rig = None if rig_path is None else load_rig(rig_path)
    if is_play(path):
        play = read_play(path)
        return _of_play(path, play, rig or _rig_of(path, play))
    loaded = load_score(path, rig)
    return Piece(
        title=loaded.score.title or os.path.basename(path),
        rig=loaded.rig,
        abilities=loaded.abilities,
        tracks=loaded.tracks,
        tempo=loaded.tempo,
        pins_s=tuple(loaded.pins_s.tolist()),
        cues=tuple(CueMark(cue.name, cue.seconds, cue.wait) for cue in loaded.cues),
    )


def is_play(path: str) -> bool:
    """Whether a file is one made for playing, by its ending or, whatever its name, by its first bytes."""
    if path.lower().endswith(".play"):
        return True
    try:
        if not os.path.isfile(path):
            return False
        with open(path, "rb") as file:
            return file.read(len(ZIP)) == ZIP
    except (OSError, ValueError):
        return False


def _rig_of(path: str, play: Play) -> Rig:
    if not os.path.isfile(play.rig_path):
        raise fault(path, f"its rig file {play.rig_path} is not there", hint="say where the rig file is with --rig RIG")
    return load_rig(play.rig_path)


def _of_play(path: str, play: Play, rig: Rig) -> Piece:
    if rig.fingerprint != play.fingerprint:
        raise _another_rig(path, play, rig)
    if play.fibers != tuple(fiber.name for fiber in rig.fibers):
        raise fault(path, f"its fibers are not those of {rig.file}", hint="retime the score again for this rig")
    return Piece(
        title=play.title or os.path.basename(path),
        rig=rig,
        abilities=abilities_of(rig),
        tracks=play.tracks,
        tempo=RetimedBars(play.tempo, play.warp_was_s, play.warp_now_s),
        pins_s=(),
        cues=tuple(CueMark(cue.name, cue.seconds, cue.wait) for cue in play.cues),
        retimed=True,
    )


def _another_rig(path: str, play: Play, rig: Rig) -> Faults:
    found = f"this was made for a rig with the fingerprint {play.fingerprint:08x}; {rig.file} has {rig.fingerprint:08x}"
    return fault(path, found, hint="give the rig that it was made for (--rig RIG), or retime the score again for this one")
