"""The statements that start in column 1, from tree to model; a new statement is one function and one row of BUILDERS."""

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from lark import Tree

from composer.score.model import Cue, Duration, Group, Meter, Name, Pin, Place, Repeat, Span, Spans, Tempo
from composer.score.moves import names_of, repeat_of
from composer.score.row import Row, tokens_of


@dataclass(frozen=True, slots=True)
class Text:
    """A statement that is one word or text: `title`, `rig`, `use`, `keep`."""

    kind: str
    name: Name
    span: Span


@dataclass(frozen=True, slots=True)
class PhraseHead:
    """The first line of a phrase."""

    name: str
    length: Duration | None
    span: Span
    spans: Spans


@dataclass(frozen=True, slots=True)
class SectionHead:
    """The first line of a section."""

    name: str
    at: Place
    repeat: Repeat | None
    keep: str
    firm: Fraction
    span: Span
    spans: Spans


def statement_of(tree: Tree, row: Row, body: str) -> Any:
    """A statement's model object."""
    return BUILDERS[str(tree.data)](tree, row, row.whole(body))


def _text(tree: Tree, row: Row, span: Span) -> Text:
    word, token = tree.children
    inner = row.span(token)
    text = str(token)
    if token.type == "STRING":
        text, inner = text[1:-1], Span(inner.file, inner.line, inner.column + 1, inner.end - 1)
        if not text.strip():
            row.fault(row.span(token), f"the text after '{word}' is empty", "a text between the quotes")
    return Text(str(word), Name(text, inner), span)


def _meter(tree: Tree, row: Row, span: Span) -> Meter:
    found = tokens_of(tree)
    signature = found["SIGNATURE"]
    counts, _, note = str(signature).partition("/")
    start = signature.start_pos
    values = [
        int(row.number_of(type(signature)("NUMBER", text, start_pos=at), name))
        for text, at, name in ((counts, start, "counts"), (note, start + len(counts) + 1, "note"))
    ]
    at = row.place(found["PLACE"]) if "PLACE" in found else None
    if row.sound and values[1] & (values[1] - 1):
        row.fault(row.span(signature), f"a note value of {values[1]} is none", "1, 2, 4, 8, 16, 32 or 64")
    if at is not None and at.seconds is not None:
        row.fault(at.span, "a meter begins at a bar, not at a number of seconds", "the first count of a bar, such as 9:1")
    elif at is not None and row.sound and at.count != 1:
        row.fault(at.span, f"a meter begins at the first count of a bar, not at count {at.count}", f"{at.bar}:1")
    return Meter(*values, at, span, row.spans(signature=signature))


def _tempo(tree: Tree, row: Row, span: Span) -> Tempo:
    found = tokens_of(tree)
    at = row.place(found["PLACE"]) if "PLACE" in found else None
    return Tempo(row.number_of(found["NUMBER"], "tempo"), None, at, None, span, row.spans(rate=found["NUMBER"]))


def _ramp(tree: Tree, row: Row, span: Span) -> Tempo:
    _, first, _, last, _, start, _, end = tree.children
    rates = row.number_of(first, "tempo"), row.number_of(last, "tempo")
    return Tempo(*rates, row.place(start), row.place(end), span, row.spans(rate=first, to=last))


def _group(tree: Tree, row: Row, span: Span) -> Group:
    _, name, names = tree.children
    return Group(str(name), names_of(names, row), span, row.spans(name=name))


def _pin(tree: Tree, row: Row, span: Span) -> Pin:
    at = until = every = within = word = None
    for child in tree.children:
        if child.type == "PLACE":
            at, until = (row.place(child), None) if word is None else (at, row.place(child))
        elif child.type == "DURATION":
            value = row.duration(child, "within" if word == "WITHIN" else "every")
            every, within = (every, value) if word == "WITHIN" else (value, within)
        elif child.type != "PIN":
            word = child.type
    return Pin(at, every, until, within, span)


def _cue(tree: Tree, row: Row, span: Span) -> Cue:
    text = _text(Tree("cue", tree.children[:2]), row, span)
    found = tokens_of(tree)
    place = row.place(found["PLACE"])
    return Cue(text.name.text, place, "WAIT" in found, span, (("name", text.name.span), *row.spans(wait=found.get("WAIT"))))


def _phrase(tree: Tree, row: Row, span: Span) -> PhraseHead:
    found = tokens_of(tree)
    name = found["PHRASE_NAME"]
    length = row.duration(found["DURATION"], "length") if "DURATION" in found else None
    return PhraseHead(str(name), length, span, row.spans(name=name))


def _section(tree: Tree, row: Row, span: Span) -> SectionHead:
    _, name, _, place, *rest = tree.children
    options = row.once(rest)
    repeat = repeat_of(options["times"], row) if "times" in options else None
    if repeat is not None and repeat.every is None:
        row.fault(
            repeat.span, "a section's repeats need the time between them", "'every' and a duration, such as 'times 4 every 8'"
        )
    firm = options["firm"].children[1] if "firm" in options else None
    return SectionHead(
        str(name),
        row.place(place),
        repeat,
        str(options["keep"].children[1]) if "keep" in options else "",
        row.number_of(firm, "firm") if firm is not None else Fraction(1),
        span,
        row.spans(name=name, **{word: option.children[0] for word, option in options.items()}, **{"firm number": firm}),
    )


BUILDERS: dict[str, Callable[[Tree, Row, Span], Any]] = {
    "title": _text,
    "rig": _text,
    "use": _text,
    "keep": _text,
    "meter": _meter,
    "tempo": _tempo,
    "ramp": _ramp,
    "group": _group,
    "pin": _pin,
    "cue": _cue,
    "phrase": _phrase,
    "section": _section,
}
