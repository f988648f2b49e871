"""What a command writes: in the form that its name says, never over what it reads, nor twice over the same file."""

import os

import click


class MadeFile(click.ParamType):
    """The name of a file that is made, whose ending says what is made; a device or pipe may have any name.

    endings: those that will do, with their dots
    """

    name = "file"

    def __init__(self, *endings: str):
        self._endings = endings

    def convert(self, value: str, param: click.Parameter | None, ctx: click.Context | None) -> str:
        """The name as it is; another ending is refused while the call is read, before anything is done."""
        path = os.fspath(value)
        # What the shell has put behind /dev/stdout may be a file.
        into_device = path.startswith("/dev/") or not (os.path.isfile(path) or os.path.isdir(path) or not os.path.exists(path))
        if not into_device and not path.lower().endswith(self._endings):
            has = os.path.splitext(path)[1]
            found = f"ends in '{has}'" if has else "has no ending"
            self.fail(f"'{value}' {found}; expected {' or '.join(self._endings)}, which says what is made.", param, ctx)
        return path


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
