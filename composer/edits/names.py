"""The names of a text as it stands, half-typed or not: phrases, groups, sections, cues and places, each with its line."""

import re
from dataclasses import dataclass

_HEAD = re.compile(r"(phrase|group|section)\s+([^\W\d_][\w.\-]*)(.*)")
_CUE = re.compile(r'cue\s+"([^"]*)"\s+at\s+(\S+)(.*)')
_PLACE = re.compile(r"\bat\s+(-?[0-9]\S*)")


@dataclass(frozen=True, slots=True)
class Named:
    """A name, the line (from 1) in which it is made, and the rest of that line without its comment."""

    name: str
    line: int
    rest: str


@dataclass(frozen=True, slots=True)
class Names:
    """What a text names; places are "9:1" with what stands there, such as 'cue "ebb"' or 'section ebb'."""

    phrases: tuple[Named, ...]
    groups: tuple[Named, ...]
    sections: tuple[Named, ...]
    cues: tuple[Named, ...]
    places: tuple[tuple[str, str], ...]


def names_of(lines: tuple[str, ...] | list[str]) -> Names:
    """The names of a text's lines: those in column 1 that look like heads, whatever else is wrong with them."""
    found: dict[str, list[Named]] = {"phrase": [], "group": [], "section": [], "cue": []}
    places: dict[str, str] = {}
    for number, line in enumerate(lines, 1):
        if line[:1] not in ("p", "g", "s", "c"):
            continue
        if head := _HEAD.match(line):
            kind, name, rest = head.groups()
            found[kind].append(Named(name, number, rest.partition("#")[0].strip()))
            if kind == "section" and (place := _PLACE.search(rest)):
                places.setdefault(place[1], f"section {name}")
        elif cue := _CUE.match(line):
            found["cue"].append(Named(cue[1], number, cue[2]))
            places[cue[2]] = f'cue "{cue[1]}"'
        elif line.startswith("pin") and (pin := re.match(r"pin\s+(\S+)", line)):
            places.setdefault(pin[1], "pin")
    return Names(*(tuple(found[kind]) for kind in ("phrase", "group", "section", "cue")), tuple(places.items()))
