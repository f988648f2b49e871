"""One file of a score: its lines, each parsed by itself, put together into phrases and sections by their indent."""

from dataclasses import dataclass, field
from typing import Any

from composer.faults import Fault, Where
from composer.score.bounds import BOUNDS, most
from composer.score.checks import BAD_METER
from composer.score.grammar import Misfit, body_of, parse_line
from composer.score.model import Cue, Entry, Group, Line, Meter, Phrase, Pin, Section, Tempo
from composer.score.moves import entry_of, line_of
from composer.score.row import Row
from composer.score.statements import PhraseHead, SectionHead, Text, statement_of


@dataclass(slots=True)
class Sheet:
    """What one file says, in the order of its lines; `doubtful` are names whose statement could not be read.

    loose: entries of sections whose first line could not be read
    torn: phrases that have lines which could not be read, so that what is said of the whole must wait
    """

    file: str
    lines: tuple[str, ...] = ()
    texts: list[Text] = field(default_factory=list)
    meters: list[Meter] = field(default_factory=list)
    tempi: list[Tempo] = field(default_factory=list)
    groups: list[Group] = field(default_factory=list)
    pins: list[Pin] = field(default_factory=list)
    cues: list[Cue] = field(default_factory=list)
    phrases: list[Phrase] = field(default_factory=list)
    sections: list[Section] = field(default_factory=list)
    faults: list[Fault] = field(default_factory=list)
    doubtful: set[str] = field(default_factory=set)
    torn: set[str] = field(default_factory=set)
    loose: list[Entry] = field(default_factory=list)


@dataclass(slots=True)
class _Block:
    """The block that is open: what starts its lines, its head (None where it could not be read), what it holds so far."""

    start: str
    head: PhraseHead | SectionHead | None
    rows: list[Any] = field(default_factory=list)
    torn: bool = False


_STARTS = {"phrase": "move", "section": "entry"}


def read_sheet(text: str, file: str) -> Sheet:
    """Read one file; its faults are in the sheet, in the order of its lines."""
    sheet = Sheet(file)
    if len(text) > most("file") or len(text.encode("utf-8", "replace")) > most("file"):
        sheet.faults.append(_too_much(Where(file), "file", "split it, and bring the parts in with 'use'"))
        return sheet
    sheet.lines = tuple(line.removesuffix("\r") for line in text.split("\n"))
    if len(sheet.lines) > most("lines") + 1:
        sheet.faults.append(_too_much(Where(file), "lines", "split it, and bring the parts in with 'use'"))
        return sheet
    block: _Block | None = None
    for number, line in enumerate(sheet.lines, 1):
        if len(sheet.faults) >= most("faults"):
            break
        if len(line) > most("line"):
            sheet.faults.append(_too_much(Where(file, number), "line", "name parts of it in groups"))
            continue
        if number == 1 and line.startswith("\ufeff"):  # a byte order mark is no part of the first word, nor an indent
            body, indented = body_of(" " + line[1:]), False
        else:
            body, indented = body_of(line), line[:1].isspace()
        if not body.strip():
            continue
        row = Row(file, number, line, sheet.faults)
        if indented:
            _inner(sheet, block, row, body)
        else:
            _close(sheet, block)
            block = _outer(sheet, row, body)
    _close(sheet, block)
    return sheet


def _too_much(where: Where, name: str, hint: str) -> Fault:
    bound = BOUNDS[name]
    return Fault(where, f"more than {bound.most} {bound.says}", "", hint)


def _misfit(sheet: Sheet, row: Row, misfit: Misfit) -> None:
    row.sound = False
    at = Where(row.file, row.number, misfit.column, misfit.width, row.text)
    sheet.faults.append(Fault(at, misfit.found, misfit.expected, misfit.hint))


def _inner(sheet: Sheet, block: _Block | None, row: Row, body: str) -> None:
    """An indented line: of the open block, or of none."""
    if block is None:
        row.fault(row.whole(body), "an indented line belongs to a phrase or a section, and none is open here",
                  "a statement in column 1")  # fmt: skip
        return
    if not block.start:
        return
    tree = parse_line(block.start, body)
    if isinstance(tree, Misfit):
        _misfit(sheet, row, tree)
        block.torn = True
        return
    made = (line_of if block.start == "move" else entry_of)(tree, row, body)
    if row.sound:
        block.rows.append(made)
    else:
        block.torn = True


def _outer(sheet: Sheet, row: Row, body: str) -> _Block | None:
    """A statement in column 1, and the block that it opens. The lines below one that cannot be read are read all the same."""
    tree = parse_line("statement", body)
    if isinstance(tree, Misfit):
        _misfit(sheet, row, tree)
        word, _, rest = body.strip().partition(" ")
        sheet.doubtful.update(rest.replace("=", " ").split()[:1])
        likely = tree.hint.removeprefix("did you mean '").removesuffix("'?") if tree.column == 1 else word
        if likely == "meter":
            sheet.doubtful.add(BAD_METER)
        return _Block(_STARTS.get(likely, ""), None)
    made = statement_of(tree, row, body)
    kept = row.sound
    if isinstance(made, PhraseHead | SectionHead):
        if not kept:
            sheet.doubtful.add(made.name)
        return _Block("move" if isinstance(made, PhraseHead) else "entry", made if kept else None)
    if not kept:
        if isinstance(made, Group | Meter):
            sheet.doubtful.add(made.name if isinstance(made, Group) else BAD_METER)
        return None
    lists = {Text: sheet.texts, Meter: sheet.meters, Tempo: sheet.tempi, Group: sheet.groups, Pin: sheet.pins, Cue: sheet.cues}
    lists[type(made)].append(made)
    return None


def _close(sheet: Sheet, block: _Block | None) -> None:
    """Put a block's head and lines together."""
    if block is None:
        return
    if block.head is None:
        if block.start == "entry":
            sheet.loose.extend(block.rows)
        return
    head, rows = block.head, tuple(block.rows)
    if isinstance(head, PhraseHead):
        lines: tuple[Line, ...] = rows
        sheet.phrases.append(Phrase(head.name, head.length, lines, head.span, head.spans))
        if block.torn:
            sheet.torn.add(head.name)
    else:
        entries: tuple[Entry, ...] = rows
        sheet.sections.append(Section(head.name, head.at, head.repeat, head.keep, head.firm, entries, head.span, head.spans))
