"""Fibers as a score names them, in the fewest words."""

from collections.abc import Iterable

from composer.rig.model import Rig
from composer.rig.select import Selector, UnknownName
from composer.score.model import Score
from composer.score.names import groups_of


def selection(fibers: Iterable[int], score: Score, rig: Rig) -> str:
    """A selection that means these fibers (indices) and no others: a group where there is one, else ranges and names."""
    wanted = tuple(sorted(set(fibers)))
    selector = Selector(rig, groups_of(score))
    for name in (*score.groups, *rig.groups):
        try:
            if tuple(sorted(selector.resolve(name))) == wanted:
                return name
        except UnknownName:
            continue
    told: list[str] = []
    at = 0
    while at < len(wanted):
        end = at + 1
        while end < len(wanted) and _follows(rig.fibers[wanted[end - 1]].name, rig.fibers[wanted[end]].name):
            end += 1
        first, last = rig.fibers[wanted[at]].name, rig.fibers[wanted[end - 1]].name
        range_ = f"{first}-{last.rpartition('.')[2]}"
        if end - at > 1 and _means(selector, range_, wanted[at:end]):
            told.append(range_)
        else:
            told += [rig.fibers[n].name for n in wanted[at:end]]
        at = end
    return ", ".join(told)


def _means(selector: Selector, name: str, fibers: tuple[int, ...]) -> bool:
    try:
        return tuple(selector.resolve(name)) == fibers
    except UnknownName:
        return False


def _follows(before: str, name: str) -> bool:
    """Whether names are reed.3 and reed.4."""
    stem, _, number = name.rpartition(".")
    was, _, last = before.rpartition(".")
    plain = number.isdecimal() and last.isdecimal() and str(int(number)) == number and str(int(last)) == last
    return bool(stem) and stem == was and plain and int(number) == int(last) + 1
