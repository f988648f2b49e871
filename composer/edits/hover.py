"""What a word of a text means here, in this score and on this rig."""

from dataclasses import dataclass

from composer.edits.made import Made


@dataclass(frozen=True, slots=True)
class Hover:
    """An explanation: columns, from 1, `start` to before `end` of the word, a title and lines below it."""

    start: int
    end: int
    title: str
    lines: tuple[str, ...]


def explain(text: str, line: int, column: int, made: Made | None = None) -> Hover | None:
    """What stands at a place (line and column from 1) means here; None where there is nothing to say.

    `made` is the last state that could be read; without one only the language itself is explained.
    """
    raise NotImplementedError
