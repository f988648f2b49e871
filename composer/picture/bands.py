"""How the threads of a rig fall into bands: where one row of fibers or one group ends and the next begins."""

from dataclasses import dataclass
from itertools import pairwise

from composer.rig.model import Rig


@dataclass(frozen=True, slots=True)
class Band:
    """Fibers `first` to before `last`, in the rig's order, under one name."""

    name: str
    first: int
    last: int


def bands_of(rig: Rig) -> tuple[Band, ...]:
    """The rig's bands: cut where the stem of the names changes, and at the ends of groups that are one unbroken run.

    A band that is just such a group bears its name, any other the stem of its fibers. Groups picked here and there (every
    second fiber) cut nothing.
    """
    count = len(rig.fibers)
    stems = [fiber.name.rpartition(".")[0] or fiber.name for fiber in rig.fibers]
    runs = {}
    for name, members in rig.groups.items():
        first, last = min(members, default=0), max(members, default=-1) + 1
        if 1 < last - first < count and last - first == len(set(members)):
            runs.setdefault((first, last), name)
    cuts = {0, count} | {at for run in runs for at in run}
    cuts |= {at for at in range(1, count) if stems[at] != stems[at - 1]}
    edges = sorted(cuts)
    return tuple(Band(runs.get((first, last), stems[first]), first, last) for first, last in pairwise(edges))
