"""What may stand at a place of a text, nearest first, with a word of explanation each."""

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from difflib import SequenceMatcher

from composer.edits.colouring import LONGEST, blank, block_of, blocks_until, class_of
from composer.edits.language import UNITS, word_at
from composer.edits.made import Made
from composer.edits.names import Names, names_of
from composer.score.grammar import Partly, body_of, parse_partly
from composer.score.words import OPTIONS, SAMPLES, STATEMENTS, TARGET_UNITS
from composer.score.words import UNITS as DURATION_UNITS
from composer.shapes import NAMES as SHAPES

NEAR = 0.6
"""How alike a name must be to what is typed to be offered, where none begins with it or has it within."""

MOST_COMPARED = 5000
"""Names that are held against what is typed letter by letter; beyond, only those that contain it."""

_HEAD = re.compile(r'[^\s,="]*')
_NUMBER = re.compile(r"-?[0-9]+(\.[0-9]*|(\+[0-9]*)?/[0-9]*)?")


Paths = Callable[[str, str], Sequence[str]]


@dataclass(frozen=True, slots=True)
class Offer:
    """Something that may stand here: its text, what it means, its kind (a class of `colouring.CLASSES`), and the columns,
    from 1, `start` to before `end` of the line, that it takes the place of."""

    text: str
    says: str
    kind: str
    start: int
    end: int


@dataclass(frozen=True, slots=True)
class _Place:
    """Where the caret is: what is typed of a word so far, the line before it parsed, names, the last good state."""

    typed: str
    block: str
    partly: Partly
    names: Names
    made: Made | None
    line: int
    paths: Paths


_Bare = tuple[str, str, str, str]
"""Text, explanation, kind, and another word by which it is found ("" for none)."""


def complete(
    text: str, line: int, column: int, made: Made | None = None, most: int = 200, paths: Paths = lambda typed, ending: ()
) -> tuple[Offer, ...]:
    """What may stand at the caret (line and column from 1; column 1 is before the first character), the likeliest first.

    `made` is the last state that could be read, for fibers, groups and partners; names in the text itself count as typed.
    paths: from what is typed of a path, and the ending of what is wanted, to the files and folders (with a / behind) there
    """
    lines = text.split("\n")
    if not 0 < line <= len(lines) or len(lines[line - 1]) > LONGEST:
        return ()
    row = lines[line - 1].removesuffix("\r")
    head = row[: max(0, column - 1)].replace("\ufeff", " ")
    if len(body_of(head)) < len(head.rstrip()):
        return ()  # in a comment
    block = blocks_until(lines, line) if head[:1].isspace() else "statement"
    if blank(row) and not head:
        block = "statement"
    elif not blank(row):
        block = block_of(row, block)
    if not block:
        return ()
    start = head.rindex('"') if head.count('"') % 2 else _word_start(head)
    before, typed = head[:start], head[start:]
    partly = parse_partly(block, before)
    if partly.stop < len(before.rstrip()):
        # A number whose unit stands apart, such as 0.8 m/s, has been begun and may go on.
        begun = before[partly.stop :]
        if not _NUMBER.fullmatch(begun.strip()) or not partly.accepts & {"SPEED", "HERTZ"}:
            return ()
        before, typed, start = before[: partly.stop], begun.strip() + " " + typed, partly.stop
    rest = _HEAD.match(row, len(head)).end() if not typed.startswith('"') else len(head)
    place = _Place(typed, block, partly, names_of(lines), made, line, paths)
    found: dict[str, _Bare] = {}
    for token in _order(partly.accepts - _used(block, partly)):
        for bare in _OFFERS.get(token, _keyword)(place, token):
            found.setdefault(bare[0], bare)
    ranked = _ranked(list(found.values()), typed)
    return tuple(Offer(name, says, kind, start + 1, rest + 1) for name, says, kind, _ in ranked[:most])


_ORDER = {name.upper(): n for n, name in enumerate((*STATEMENTS, *SHAPES, *OPTIONS))}
_FIRST = ("SELECTION", "PHRASE_NAME", "DURATION", "PLACE", "REST", "FULL", "HOLD", "TARGET")
_LONGEST = 64
"""Characters of a word up to which it is held against names letter by letter."""


def _word_start(head: str) -> int:
    """Where the word begins that a text ends with."""
    at = len(head)
    while at and not head[at - 1].isspace() and head[at - 1] not in ',="':
        at -= 1
    return at


_GO_ON = ("FROM", "EVERY", "TO", "WITHIN", "UNTIL", "WAIT")
"""Words that go on with what has just been written, before those that begin something else."""


_ONE_OF = ({"AT", "AFTER"}, {name.upper() for name in SHAPES})
"""Of each of these a line may have one."""


def _used(block: str, partly: Partly) -> set[str]:
    """Options and manners that a line has already: each may stand there once."""
    if block == "statement" and partly.tokens[:1] and partly.tokens[0].type != "SECTION":
        return set()
    once = {"TIMES", "KEEP", "FIRM"} if block == "statement" else {*(name.upper() for name in OPTIONS), "OVER", "QUIVER"}
    here = {token.type for token in partly.tokens}
    used = here & once
    return used.union(*(some for some in _ONE_OF if block != "statement" and some & here))


def _order(accepts: frozenset[str]) -> list[str]:
    """Names and values before words, words in the order of their tables."""

    def rank(token: str) -> tuple[int, int, str]:
        if token in _FIRST:
            return 0, _FIRST.index(token), token
        if token in _GO_ON:
            return 1, _GO_ON.index(token), token
        return (2, _ORDER[token], token) if token in _ORDER else (3, 0, token)

    return sorted(accepts - {"$END"}, key=rank)


def _ranked(offers: list[_Bare], typed: str) -> list[_Bare]:
    """Those that begin with what is typed, those that have it behind a dot or within, then those that are like it."""
    if not typed:
        return offers
    wanted = typed.lower()
    short = len(wanted) <= _LONGEST and len(offers) <= MOST_COMPARED
    ranks: list[tuple[float, int, _Bare]] = []
    for n, offer in enumerate(offers):
        name, other = offer[0].lower(), offer[3].lower()
        if name.startswith(wanted):
            rank = 0.0
        elif other.startswith(wanted) and other:
            rank = 1.0
        elif re.search(r"(?<=[.\-_])" + re.escape(wanted), name):
            rank = 2.0
        elif wanted in name and len(wanted) > 1:
            rank = 3.0
        elif short and (like := SequenceMatcher(None, wanted, name).ratio()) >= NEAR:
            rank = 5.0 - like
        else:
            continue
        ranks.append((rank, n, offer))
    return [offer for _, _, offer in sorted(ranks, key=lambda one: one[:2])]


def _keyword(place: _Place, token: str) -> Iterator[_Bare]:
    """A word of the language."""
    if token in SAMPLES:
        return
    word = token.lower()
    told = word_at(word, place.block, not place.partly.tokens)
    number = len(place.partly.tokens)
    kind = class_of(_Like(token), place.block, number)
    says = "" if told is None else told.says if told.form == word else f"{told.form}: {told.says}"
    yield word, says, kind, ""


@dataclass(frozen=True, slots=True)
class _Like:
    """Something with a token's type."""

    type: str


def _fibers(place: _Place, _: str) -> Iterator[_Bare]:
    """Groups of the text and of the rig, ranges and wildcards, then fibers one by one."""
    made = place.made
    for group in place.names.groups:
        if group.line != place.line:
            yield group.name, f"group of line {group.line}: {group.rest.lstrip('= ')}", "fiber", ""
    if made is None:
        return
    count = {name: len(fibers) for name, fibers in made.rig.groups.items()}
    for name, fibers in count.items():
        yield name, f"group of the rig, {fibers} fiber{'' if fibers == 1 else 's'}", "fiber", ""
    stems: dict[str, list[str]] = {}
    for fiber in made.rig.fibers:
        stem, _, last = fiber.name.rpartition(".")
        if stem:
            stems.setdefault(stem, []).append(last)
    typed = re.fullmatch(r"(.*\.)([0-9]{1,9})-[0-9]*", place.typed)
    for stem, ends in stems.items():
        numbers = sorted(int(end) for end in ends if end.isdecimal())
        low, high = (numbers[0], numbers[-1]) if numbers else (0, 0)
        if len(numbers) > 1 and high - low + 1 == len(numbers):
            yield f"{stem}.{low}-{high}", f"a range, {len(numbers)} fibers", "fiber", ""
            if typed and typed[1] == f"{stem}." and low <= int(typed[2]) < high:
                first = int(typed[2])
                yield f"{stem}.{first}-{high}", f"a range, {high - first + 1} fibers", "fiber", ""
        if len(ends) > 1:
            yield f"{stem}.*", f"every fiber whose name begins with {stem}.", "fiber", ""
    for fiber in made.rig.fibers:
        yield fiber.name, f"a fiber of type {fiber.type.name}, channel {fiber.channel} of {fiber.driver}", "fiber", ""


def _phrases(place: _Place, _: str) -> Iterator[_Bare]:
    """The phrases there are, those of the text nearest first; behind `phrase`, names that are played and not there yet."""
    mine = {phrase.name: phrase for phrase in place.names.phrases}
    if place.block == "statement":
        if place.made is not None:
            played = {e.phrase.text: e.span.line for s in place.made.score.sections for e in s.entries}
            for name, line in played.items():
                if name not in mine and name not in place.made.score.phrases:
                    yield name, f"played in line {line}, not written yet", "phrase", ""
        return
    for name, phrase in sorted(mine.items(), key=lambda one: abs(one[1].line - place.line)):
        length = f", {phrase.rest} long" if phrase.rest else ""
        yield name, f"phrase of line {phrase.line}{length}", "phrase", ""
    if place.made is not None:
        for name, phrase in place.made.score.phrases.items():
            if name not in mine and phrase.span.file != place.made.score.file:
                yield name, f"phrase of {phrase.span.file}, line {phrase.span.line}", "phrase", ""


def _places(place: _Place, _: str) -> Iterator[_Bare]:
    """Places that the text names, found by their cue's or section's name too."""
    here = [section for section in place.names.sections if section.line < place.line] if place.block == "entry" else []
    begins = _bar(here[-1].rest.partition("at")[2].strip()) if here else None
    places = list(place.names.places)
    if begins is not None:
        places.sort(key=lambda one: abs((_bar(one[0]) or 0) - begins))
    for where, what in places:
        if here and what == f"section {here[-1].name}":
            continue  # where the entry starts anyway
        yield where, what, "place", what.partition(" ")[2].strip('"')
    if place.typed.isdecimal():
        yield f"{place.typed}:1", f"bar {place.typed}, its first count", "place", ""
        yield f"{place.typed}s", "seconds from the start of the score", "place", ""
    elif not place.typed and not place.names.places:
        yield "1:1", "bar 1, count 1", "place", ""


def _bar(where: str) -> int | None:
    """The bar of a place as written; None for one in seconds."""
    bar, colon, _ = where.partition(":")
    return int(bar) if colon and bar.isdecimal() and len(bar) < 8 else None


_COUNTED = ("1", "2", "4", "1/2", "1/4", "1/8")


def _durations(place: _Place, _: str) -> Iterator[_Bare]:
    if _NUMBER.fullmatch(place.typed):
        for unit in DURATION_UNITS:
            told = UNITS.get(unit, "counts")
            if unit != ("bars" if place.typed == "1" else "bar"):
                yield f"{place.typed}{unit}", told, "number", ""
    elif place.block == "move" and not place.partly.tokens:
        yield "0", "a line at 0 says where the phrase begins", "number", ""
    else:
        for text in _COUNTED:
            yield text, "count" if text == "1" else "counts", "number", ""
        for number, unit in (("1", "bar"), ("2", "bars"), ("1.5", "s")):
            yield f"{number}{unit}", UNITS[unit], "number", ""


def _targets(place: _Place, _: str) -> Iterator[_Bare]:
    if _NUMBER.fullmatch(place.typed):
        for unit in TARGET_UNITS:
            yield f"{place.typed}{unit}", UNITS.get(unit, "share of the usable stroke, 0 to 1"), "number", ""
        if place.typed.isdecimal() and 1 < int(place.typed[:4]) < 100:
            share = f"{int(place.typed) / 100:g}"
            yield share, f"{place.typed} % of the usable stroke", "number", place.typed
    else:
        yield "0.5", "half of the usable stroke: a share of it, 0 to 1", "number", ""
        for number, unit in (("12", "%"), ("240", "mm"), ("90", "deg")):
            yield f"{number}{unit}", UNITS[unit], "number", ""


def _hertz(place: _Place, _: str) -> Iterator[_Bare]:
    typed = place.typed.split(" ")[0]
    for number in (typed,) if _NUMBER.fullmatch(typed) else ("1", "2", "4"):
        yield f"{number}Hz", UNITS["Hz"], "number", f"{number} Hz"


def _speeds(place: _Place, _: str) -> Iterator[_Bare]:
    typed = place.typed.split(" ")[0]
    for number in (typed,) if _NUMBER.fullmatch(typed) else ("0.5", "1", "2"):
        yield f"{number} m/s", "metres a second; a negative speed runs the other way", "number", ""


def _numbers(place: _Place, _: str) -> Iterator[_Bare]:
    word = str(place.partly.tokens[-1]) if place.partly.tokens else ""
    for text in ("60", "72", "96", "120") if word in ("tempo", "to") else ("1/2", "2/3", "3/2", "2"):
        yield text, "counts a minute" if word in ("tempo", "to") else "", "number", ""


def _integers(place: _Place, _: str) -> Iterator[_Bare]:
    seed = bool(place.partly.tokens) and str(place.partly.tokens[-1]) == "seed"
    for text in ("1", "7") if seed else ("2", "3", "4", "8"):
        yield text, "another number gives another scatter" if seed else "times", "number", ""


def _signatures(place: _Place, _: str) -> Iterator[_Bare]:
    for text in ("4/4", "3/4", "2/4", "6/8"):
        yield text, f"{text.partition('/')[0]} counts in a bar", "number", ""


ENDINGS = {"rig": (".rig.toml", "a rig file"), "use": (".score", "a score")}
"""What the files that a statement names end in, and what they are called."""


def _paths(place: _Place, _: str) -> Iterator[_Bare]:
    score = None if place.made is None else place.made.score
    opens = str(place.partly.tokens[0]) if place.partly.tokens else ""
    if score is not None and opens == "rig" and score.rig is not None:
        yield score.rig.text, "the rig as it was", "path", ""
    ending, what = ENDINGS.get(opens, ("", ""))
    quoted = '"' if place.typed.startswith('"') else ""
    for path in place.paths(place.typed.removeprefix('"'), ending) if ending else ():
        # A path with a blank in it stands in quotes.
        quote = '"' if quoted or any(c in path for c in ' "#') else ""
        says = "a folder" if path.endswith("/") else what
        yield (
            f"{quote}{path}{quote if not path.endswith('/') else ''}",
            says,
            "path",
            path if quote else path.rpartition("/")[2],
        )


def _texts(place: _Place, _: str) -> Iterator[_Bare]:
    opens = str(place.partly.tokens[0]) if place.partly.tokens else ""
    if opens == "cue":
        taken = {cue.name for cue in place.names.cues}
        for section in place.names.sections:
            if section.name not in taken:
                yield f'"{section.name}"', f"as the section of line {section.line}", "text", section.name
    elif opens == "title" and place.made is not None and place.made.score.title:
        yield f'"{place.made.score.title}"', "the title as it was", "text", ""


def _texts_or_paths(place: _Place, token: str) -> Iterator[_Bare]:
    """A path may stand in quotes too."""
    yield from _paths(place, token) if place.typed.startswith('"') else ()
    yield from _texts(place, token)


_OFFERS: dict[str, Callable[[_Place, str], Iterator[_Bare]]] = {
    "SELECTION": _fibers, "PHRASE_NAME": _phrases, "PLACE": _places, "DURATION": _durations, "TARGET": _targets,
    "HERTZ": _hertz, "SPEED": _speeds, "NUMBER": _numbers, "INTEGER": _integers, "SIGNATURE": _signatures,
    "PATH": _paths, "STRING": _texts_or_paths,
}  # fmt: skip
