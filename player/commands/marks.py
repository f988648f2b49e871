"""A mark of a pre-flight as a line, the same wherever it is shown."""

from player.outputs.base import Mark


def line(mark: Mark) -> str:
    """`ok` or `NO`, what was asked, what was found, and on a line of its own what to do where it is not so."""
    told = f"{'ok' if mark.ok else 'NO'}  {mark.asked}" + (f" ({mark.found})" if mark.found else "")
    return told if mark.ok or not mark.hint else f"{told}\n      {mark.hint}"
