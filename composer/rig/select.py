"""Which fibers a name means: a fiber, a group, a range such as reed.1-8, a wildcard such as reed.*."""

import re
from collections.abc import Iterable, Mapping, Sequence

from composer.faults import nearest
from composer.rig.model import Rig

_DEEPEST = 64
_RANGE = re.compile(r"(.*?)([0-9]{1,9})-([0-9]{1,9})", re.DOTALL)


class UnknownName(Exception):
    """A name that means no fiber: `name` as asked for, or as a group has it; `hint` what to do about it."""

    def __init__(self, name: str, hint: str):
        self.name = name
        self.hint = hint
        super().__init__(f"no fiber or group '{name}'" + (f"; {hint}" if hint else ""))


class Circle(UnknownName):
    """A group that has no end: `members` are the groups that lead back into one another, or ever deeper."""

    def __init__(self, name: str, hint: str, members: tuple[str, ...]):
        super().__init__(name, hint)
        self.members = members


class Selector:
    """Looks names up in a rig and in further groups, those of a score; each name is worked out once."""

    def __init__(self, rig: Rig | Sequence[str], groups: Mapping[str, tuple[str, ...]]):
        """Of a rig, or of the names of its fibers while it is being read."""
        self._names = tuple(fiber.name for fiber in rig.fibers) if isinstance(rig, Rig) else tuple(rig)
        self._index = {name: index for index, name in enumerate(self._names)}
        self._groups = dict(groups)
        self._known: dict[str, tuple[int, ...]] = dict(rig.groups) if isinstance(rig, Rig) else {}
        self._known.update((name, (index,)) for name, index in self._index.items())
        self._open: list[str] = []

    def resolve(self, name: str) -> tuple[int, ...]:
        """Indices of the fibers that a name means, rising and each once; raises `UnknownName`.

        A fiber or group of that very name comes before a range. Where a further group has the name of one of
        the rig's, the further group counts; the reader of a score sees to it that there is no such group.
        """
        if name in self._groups:
            self._known[name] = self._group(name)
            del self._groups[name]
        if name not in self._known:
            self._known[name] = self._range(name) if _RANGE.fullmatch(name) else self._wildcard(name)
        return self._known[name]

    def _group(self, name: str) -> tuple[int, ...]:
        """The fibers of a further group, all members together."""
        if name in self._open:
            circle = self._open[self._open.index(name) :]
            raise Circle(name, "the group is a member of itself: " + " -> ".join([*circle, name]), tuple(circle))
        if len(self._open) >= _DEEPEST:
            raise Circle(name, f"groups within groups, more than {_DEEPEST} deep", tuple(self._open))
        self._open.append(name)
        try:
            return tuple(sorted({index for member in self._groups[name] for index in self.resolve(member)}))
        finally:
            self._open.pop()

    def _range(self, name: str) -> tuple[int, ...]:
        """The fibers of a range, both ends included; every one must be there."""
        stem, first, last = _RANGE.fullmatch(name).groups()
        # reed.01-12 is reed.01, reed.02: a leading zero asks for as many digits as it has.
        width = len(first) if first.startswith("0") and len(first) > 1 else 1
        if int(first) > int(last):
            raise UnknownName(name, f"a range runs upward: {stem}{last}-{first}")
        found = []
        for number in range(int(first), int(last) + 1):
            member = f"{stem}{number:0{width}d}"
            if member not in self._index:
                raise UnknownName(name, self._gap(member, stem))
            found.append(self._index[member])
        return tuple(sorted(found))

    def _gap(self, member: str, stem: str) -> str:
        """What to say where a range names a fiber that is not there."""
        numbers = sorted(int(n[len(stem) :]) for n in self._names if n.startswith(stem) and n[len(stem) :].isdecimal())
        if not numbers:
            stems = {match[1] for match in map(re.compile(r"(.*?)[0-9]+", re.DOTALL).fullmatch, self._names) if match}
            near = nearest(stem, stems)
            return f"no fiber is called '{member}'" + (f"; {near}" if near else "")
        return f"no fiber is called '{member}'; there are {stem}{numbers[0]} to {stem}{numbers[-1]}"

    def _alike(self, name: str) -> str:
        """The hint for a name that is none; one without a number more likely means a whole row than one fiber of it."""
        known = [*self._index, *self._known, *self._groups]
        if any(map(str.isdecimal, name)):
            return nearest(name, known)
        rows = {match[1] + "*" for match in map(re.compile(r"(.*\.)[0-9]+", re.DOTALL).fullmatch, self._names) if match}
        return nearest(name, [one for one in known if not one[-1:].isdecimal()] + sorted(rows)) or nearest(name, known)

    def _wildcard(self, name: str) -> tuple[int, ...]:
        """The fibers whose names fit, each `*` standing for any characters or none."""
        if "*" not in name:
            raise UnknownName(name, self._alike(name))
        parts = name.split("*")
        found = tuple(index for index, fiber in enumerate(self._names) if _fits(fiber, parts))
        if not found:
            raise UnknownName(name, f"no fiber's name fits; the fibers are {_sample(self._names)}")
        return found


def _fits(name: str, parts: list[str]) -> bool:
    """Whether `name` is the parts in their order with anything between them."""
    first, *middle, last = parts
    if len(name) < len(first) + len(last) or not name.startswith(first) or not name.endswith(last):
        return False
    at, end = len(first), len(name) - len(last)
    for part in middle:
        at = name.find(part, at, end)
        if at < 0:
            return False
        at += len(part)
    return True


def _sample(names: Iterable[str]) -> str:
    """The first few names."""
    every = list(names)
    return ", ".join(every[:6]) + (", …" if len(every) > 6 else "") if every else "none"
