"""Whether a line still carries what is said on it: the share of frames that were lost of late. Pure; times are handed in."""

from collections import deque

LATELY_S = 1.0
FEW = 40
"""Of fewer frames nothing can be said."""
TOO_MANY = 0.5
"""Where so many are lost, a run is no longer what was written."""


class Quality:
    """Takes what host and board have counted so far; says once when too much is lost, and again only after it was better."""

    def __init__(self) -> None:
        self._kept: deque[tuple[float, int, int]] = deque()
        self._said = False

    def look(self, now_s: float, lost: int, frames: int) -> tuple[int, int] | None:
        """How many of how many frames were lost of late, where that is too many, and was not said before.

        Args:
            now_s: the time, which does not go back
            lost: frames that either side could not read, since the greeting
            frames: frames that were sent, or heard whole, since the greeting
        """
        kept = self._kept
        if kept and (lost < kept[-1][1] or frames < kept[-1][2]):
            # Somebody has begun to count anew.
            kept.clear()
        if not kept or now_s - kept[-1][0] >= 0.05 * LATELY_S:
            kept.append((now_s, lost, frames))
        while len(kept) > 2 and now_s - kept[1][0] >= LATELY_S:
            kept.popleft()
        gone, all_of_them = lost - kept[0][1], frames - kept[0][2]
        bad = all_of_them >= FEW and TOO_MANY * all_of_them < gone <= 2 * all_of_them
        says, self._said = bad and not self._said, bad or (self._said and all_of_them < FEW)
        return (gone, all_of_them) if says else None
