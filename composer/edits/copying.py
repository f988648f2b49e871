"""A phrase copied under a name of its own, for one entry to play while the others keep the original."""

from collections.abc import Iterable

from composer.edits.edit import Change, Edit, Refusal, change_at, edit_of, line_starts
from composer.edits.made import Made
from composer.score.model import Entry, Phrase, Score, Section, Span
from composer.score.spans import span_of


def entry_at(score: Score, line: int) -> tuple[Section, Entry] | None:
    """The entry in a line of the score, and its section."""
    return next(((s, e) for s in score.sections for e in s.entries if e.span.line == line), None)


def copy_for_this_one(text: str, made: Made, entry: int) -> Edit | Refusal:
    """The phrase of the entry in line `entry` copied under a new name, behind the original, and the entry playing the copy.

    A phrase of another file is copied before the entry's section.
    """
    found = entry_at(made.score, entry)
    if found is None:
        return Refusal(f"Line {entry} is no entry of a section.")
    section, one = found
    phrase = made.score.phrases[one.phrase.text]
    players = [e for s in made.score.sections for e in s.entries if e.phrase.text == phrase.name]
    if len(players) == 1 and phrase.span.file == made.score.file:
        return Refusal(f"Only this entry plays '{phrase.name}': it needs no copy.")
    name = new_name(made.score, phrase.name, section.name)
    changes = [
        inserted(text, made.score, phrase, copied(made.score, phrase, name), section),
        change_at(text, one.phrase.span, name),
    ]
    return edit_of(changes, f"'{phrase.name}' copied as '{name}' for line {entry}")


def new_name(score: Score, name: str, section: str, taken: Iterable[str] = ()) -> str:
    """A name for a copy of a phrase that no phrase has yet: with the section's name behind it, and a number where it must."""
    known = {*score.phrases, *taken}
    base = f"{name}-{section}"
    return next(n for n in (base, *(f"{base}-{number}" for number in range(2, len(known) + 3))) if n not in known)


def copied(score: Score, phrase: Phrase, name: str, words: Iterable[tuple[Span, str]] = ()) -> str:
    """The text of a phrase under another name, its comments with it, and other words in place of those of some spans."""
    lines = score.lines[phrase.span.file]
    last = max([phrase.span.line, *(line.span.line for line in phrase.lines)])
    shown = {number: lines[number - 1] for number in range(phrase.span.line, last + 1)}
    changes = [(span_of(phrase, "name"), name), *words]
    for span, new in sorted(changes, key=lambda change: (change[0].line, change[0].column), reverse=True):
        line = shown[span.line]
        shown[span.line] = line[: span.column - 1] + new + line[span.end - 1 :]
    return "\n".join(line.removeprefix("\ufeff") for line in shown.values())


def inserted(text: str, score: Score, phrase: Phrase, copy: str, section: Section) -> Change:
    """A copy put in behind the phrase that it is of; before the section that plays it where the phrase is another file's."""
    starts = line_starts(text)
    ending = "\r\n" if "\r\n" in text else "\n"
    copy = copy.replace("\n", ending)
    if phrase.span.file == score.file:
        last = max([phrase.span.line, *(line.span.line for line in phrase.lines)])
        if last < len(starts):
            return starts[last], starts[last], f"{ending}{copy}{ending}"
        return len(text), len(text), f"{ending}{ending}{copy}"
    lines, before = score.lines[score.file], section.span.line
    while before > 1 and lines[before - 2].startswith("#"):
        before -= 1
    return starts[before - 1], starts[before - 1], f"{copy}{ending}{ending}"
