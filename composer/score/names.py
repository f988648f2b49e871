"""What a score says about its rig: whether the fibers and groups exist, take the units asked of them, and have partners."""

from composer.faults import Fault, nearest
from composer.fiber.kinds import KINDS
from composer.rig.model import Rig
from composer.rig.select import Selector, UnknownName
from composer.score.bounds import BOUNDS, most
from composer.score.model import Entry, Name, Phrase, Score, Section, Span, Target
from composer.score.row import where

MOST_FAULTS = 200
"""Names that are looked up in vain before no more are looked for: the search for the nearest takes its time."""


def groups_of(score: Score) -> dict[str, tuple[str, ...]]:
    """The score's groups as a `Selector` takes them."""
    return {name: tuple(member.text for member in group.members) for name, group in score.groups.items()}


def check_names(score: Score, rig: Rig, selector: Selector) -> list[Fault]:
    """All that is wrong with a score on this rig, in the order of its lines; the selector is of this rig and `groups_of` it."""
    checks = _Names(score, rig, selector)
    checks.groups()
    for section in score.sections:
        for entry in section.entries:
            checks.entry(section, entry)
    if not checks.faults:
        return []
    order = {name: at for at, name in enumerate(score.lines)}
    return sorted(checks.faults, key=lambda f: (order.get(f.where.file, 0), f.where.line, f.where.column))[: most("faults")]


class _Names:
    def __init__(self, score: Score, rig: Rig, selector: Selector):
        self.score = score
        self.rig = rig
        self.selector = selector
        self.faults: list[Fault] = []
        self.moves = 0
        self.told: set[Span] = set()
        self.fibers = {fiber.name for fiber in rig.fibers}

    def fault(self, span: Span, found: str, expected: str = "", hint: str = "") -> None:
        """Note a fault, one a span: a phrase played twenty times is told of once."""
        if span not in self.told:
            self.told.add(span)
            lines = self.score.lines.get(span.file, ())
            text = lines[span.line - 1] if 0 < span.line <= len(lines) else ""
            self.faults.append(Fault(where(span, text), found, expected, hint))

    def groups(self) -> None:
        """Names of groups that the rig has already, and their members."""
        for group in self.score.groups.values():
            span = dict(group.spans).get("name", group.span)
            if group.name in self.fibers:
                self.fault(span, f"'{group.name}' is a fiber of the rig", "another name for the group")
            elif group.name in self.rig.groups:
                self.fault(span, f"'{group.name}' is a group of the rig already", "another name for the group")
            for member in group.members:
                self.resolve(member)

    def resolve(self, name: Name) -> tuple[int, ...]:
        """The fibers of a name; none, and a fault, where there are none. A group's own members are told of at the group."""
        if len(self.faults) >= MOST_FAULTS:
            return ()
        try:
            return self.selector.resolve(name.text)
        except UnknownName as stop:
            if name.text not in self.score.groups:
                rig = self.score.rig.text if self.score.rig else self.rig.file
                hint = stop.hint or nearest(name.text, [*self.fibers, *self.rig.groups, *self.score.groups])
                self.fault(name.span, f"no fiber or group '{name.text}' in {rig}", "", hint or self._known())
        return ()

    def _known(self) -> str:
        known = [*self.score.groups, *self.rig.groups] or [fiber.name for fiber in self.rig.fibers]
        return "there are " + ", ".join(known[:8]) + (", …" if len(known) > 8 else "")

    def entry(self, section: Section, entry: Entry) -> None:
        """One entry: its fibers, their mirror partners, the units of its phrase, how many moves it makes."""
        chosen = sorted({index for name in entry.fibers for index in self.resolve(name)})
        if entry.mirror:
            alone = next((i for i in chosen if self.rig.fibers[i].mirror is None), None)
            if alone is not None:
                self.fault(
                    dict(entry.spans).get("mirror", entry.span),
                    f"{self.rig.fibers[alone].name} has no mirror partner in the rig",
                    "",
                    "give it one with 'mirror' or 'mirrored' in the rig file, or leave it out of this entry",
                )
                return
            chosen = [self.rig.fibers[index].mirror for index in chosen]
        phrase = self.score.phrases.get(entry.phrase.text)
        if phrase is None:
            return
        self.units(phrase, chosen, entry)
        repeats = (entry.repeat.times if entry.repeat else 1) * (section.repeat.times if section.repeat else 1)
        before, self.moves = self.moves, self.moves + len(chosen) * repeats * max(1, len(phrase.lines))
        if before <= most("moves") < self.moves:
            self.fault(
                entry.span,
                f"with this entry the score has more than {most('moves')} {BOUNDS['moves'].says}",
                "",
                "fewer repeats or fibers, or parts of it as scores of their own",
            )

    def units(self, phrase: Phrase, chosen: list[int], entry: Entry) -> None:
        """Every amount of a phrase in a unit that the kinds of these fibers have."""
        first: dict[str, int] = {}
        for index in chosen:
            first.setdefault(self.rig.fibers[index].type.kind, index)
        amounts = _amounts(phrase) if first else []
        for kind, index in first.items():
            takes = {"stroke", "hold"} | KINDS[kind].units
            for target in amounts:
                if target.unit not in takes:
                    self.fault(
                        target.span,
                        f"{self.rig.fibers[index].name}, a fiber of kind {kind}, has no target in {target.unit}",
                        _allowed(sorted(KINDS[kind].units)),
                        f"it plays '{phrase.name}' in line {entry.span.line}",
                    )


def _allowed(units: list[str]) -> str:
    plain = "a share of its stroke such as 0.6"
    if not units:
        return plain
    return f"{plain}, or an amount in {' or '.join([', '.join(units[:-1]), units[-1]] if units[:-1] else units)}"


def _amounts(phrase: Phrase) -> list[Target]:
    """All targets, control values and amplitudes of a phrase."""
    return [
        amount for line in phrase.lines for amount in (line.target, *line.controls, *([line.quiver.by] if line.quiver else []))
    ]
