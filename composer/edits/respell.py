"""One line of a score written anew: the model with that line's part replaced, at the cost of one line."""

from dataclasses import replace

from composer.faults import Fault
from composer.score.grammar import Misfit, body_of, parse_line
from composer.score.model import Phrase, Score, Section
from composer.score.moves import entry_of, line_of
from composer.score.row import Row
from composer.score.statements import PhraseHead, SectionHead, statement_of


def respelled(score: Score, number: int, line: str) -> tuple[Score, list[Fault]] | None:
    """The score with line `number` of its own file reading `line`, and the faults of that line; None where the line belongs to
    no phrase and no section, or has become something else, so that the whole must be read again."""
    line = line.removesuffix("\r")
    indented = line[:1].isspace()
    faults: list[Fault] = []
    row = Row(score.file, number, line, faults)
    for name, phrase in score.phrases.items():
        if phrase.span.file != score.file:
            continue
        if indented == (phrase.span.line == number):
            continue
        made = _phrase(phrase, number, line, row)
        if made is not None and made.name == name:
            return _with_text(replace(score, phrases={**score.phrases, name: made}), number, line), faults
    for at, section in enumerate(score.sections):
        if indented == (section.span.line == number):
            continue
        part = _section(section, number, line, row)
        if part is not None:
            sections = (*score.sections[:at], part, *score.sections[at + 1 :])
            return _with_text(replace(score, sections=sections), number, line), faults
    return None


def _with_text(score: Score, number: int, line: str) -> Score:
    lines = score.lines[score.file]
    return replace(score, lines={**score.lines, score.file: (*lines[: number - 1], line, *lines[number:])})


def _phrase(phrase: Phrase, number: int, line: str, row: Row) -> Phrase | None:
    if phrase.span.line == number:
        head = _head(line, row)
        return replace(phrase, name=head.name, length=head.length, span=head.span, spans=head.spans) if (
            isinstance(head, PhraseHead)
        ) else None  # fmt: skip
    for at, old in enumerate(phrase.lines):
        if old.span.line == number:
            tree = parse_line("move", body_of(line))
            if isinstance(tree, Misfit):
                return None
            made = line_of(tree, row, body_of(line))
            return replace(phrase, lines=(*phrase.lines[:at], made, *phrase.lines[at + 1 :]))
    return None


def _section(section: Section, number: int, line: str, row: Row) -> Section | None:
    if section.span.line == number:
        head = _head(line, row)
        if not isinstance(head, SectionHead):
            return None
        return Section(head.name, head.at, head.repeat, head.keep, head.firm, section.entries, head.span, head.spans)
    for at, old in enumerate(section.entries):
        if old.span.line == number:
            tree = parse_line("entry", body_of(line))
            if isinstance(tree, Misfit):
                return None
            made = entry_of(tree, row, body_of(line))
            return replace(section, entries=(*section.entries[:at], made, *section.entries[at + 1 :]))
    return None


def _head(line: str, row: Row):
    tree = parse_line("statement", body_of(line))
    return None if isinstance(tree, Misfit) else statement_of(tree, row, body_of(line))
