"""What a command writes: never over what it reads, nor twice over the same file."""

import os


def outputs_apart(outputs: dict[str, str | None], inputs: list[str | None], read: str = "what is read") -> None:
    """Raise Faults where an output, a path by its option, would be written over an input or over another output."""
    from composer.faults import fault

    taken = {os.path.realpath(path): read for path in inputs if path}
    for option, path in outputs.items():
        if path is None:
            continue
        there = taken.setdefault(os.path.realpath(path), option)
        if there != option:
            raise fault(path, f"{option} would write over {there}", "a file of its own", "nothing was written")
