"""The governor: whatever comes in, what goes out is what the rig can do."""

from player.governor.causes import CAUSES, Cause
from player.governor.governor import Governor, governor_of
from player.governor.mixing import ADDS, ALONE, SCALES, TAKES, WAYS, mixed
from player.governor.sent import tracks_of
from player.governor.state import State, begin, standing_at
from player.governor.tick import govern

__all__ = [
    "ADDS",
    "ALONE",
    "CAUSES",
    "SCALES",
    "TAKES",
    "WAYS",
    "Cause",
    "Governor",
    "State",
    "begin",
    "govern",
    "governor_of",
    "mixed",
    "standing_at",
    "tracks_of",
]
