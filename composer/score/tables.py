"""The tables of the language as the manual shows them, from the tables that the reader uses."""

from collections.abc import Iterable

from composer.score.bounds import BOUNDS, RANGES
from composer.score.words import MANNERS, OPTIONS, STATEMENTS, Word
from composer.shapes import SAYS


def _table(head: tuple[str, ...], rows: Iterable[tuple[str, ...]]) -> str:
    lines = [head, tuple("---" for _ in head), *rows]
    return "\n".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |" for line in lines)


def _words(words: dict[str, Word]) -> str:
    return _table(("written", "meaning"), ((f"`{word.form}`", word.says) for word in words.values()))


def tables() -> dict[str, str]:
    """Every table of the language page in Markdown, by name."""
    return {
        "statements": _words(STATEMENTS),
        "manners": _words(MANNERS),
        "options": _words(OPTIONS),
        "shapes": _table(("shape", "progress", "use"), ((f"`{name}`", *told) for name, told in SAYS.items())),
        "ranges": _table(("number", "range", "what it is"), ((row.name, row.told, row.says) for row in RANGES.values())),
        "bounds": _table(("at most", "of what"), ((f"{b.most:,}".replace(",", " "), b.says) for b in BOUNDS.values())),
    }
