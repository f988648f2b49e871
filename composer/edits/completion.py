"""What may stand at a place of a text, nearest first, with a word of explanation each."""

from dataclasses import dataclass

from composer.edits.made import Made


@dataclass(frozen=True, slots=True)
class Offer:
    """Something that may stand here: its text, what it means, its kind (a class of `colouring.CLASSES`), and the columns,
    from 1, `start` to before `end` of the line, that it takes the place of."""

    text: str
    says: str
    kind: str
    start: int
    end: int


def complete(text: str, line: int, column: int, made: Made | None = None, most: int = 200) -> tuple[Offer, ...]:
    """What may stand at the caret (line and column from 1; column 1 is before the first character), the likeliest first.

    `made` is the last state that could be read, for fibers, groups and partners; names in the text itself count as typed.
    """
    raise NotImplementedError
