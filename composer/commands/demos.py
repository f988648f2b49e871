"""`drawcord demos`: copy the demo scores and rigs into a folder."""

from importlib.resources import files
from pathlib import Path

import click

from composer.faults import Fault, Faults, Where
from composer.files import check_writable, replacing


@click.command()
@click.argument("folder", type=click.Path(path_type=Path), default=Path("drawcord-demos"), metavar="[DIR]")
def command(folder: Path) -> int:
    """Copy the demo scores and rigs into DIR (drawcord-demos unless given); files that are there already stay as they are."""
    demos = sorted((item.name, item.read_bytes()) for item in files("scores_demo").iterdir() if _is_demo(item.name))
    if folder.exists() and not folder.is_dir():
        raise Faults([Fault(Where(str(folder)), "this is a file", "a folder, or a name that is free")])
    there = [folder / name for name, _ in demos if (folder / name).exists()]
    if there:
        hint = "nothing was written; choose another folder, or move these files away"
        raise Faults([Fault(Where(str(path)), "this file is there already", "", hint) for path in there])
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise Faults([Fault(Where(str(folder)), f"cannot make the folder: {error.strerror}")]) from None
    for name, _ in demos:
        check_writable(folder / name)
    for name, data in demos:
        with replacing(folder / name, "wb") as file:
            file.write(data)
        click.echo(folder / name)
    scores = [folder / name for name, _ in demos if name.endswith(".score")]
    if scores:
        click.echo("\nThe pieces and rigs are invented. To try:")
        score, play = _quoted(scores[0]), _quoted(scores[0].with_suffix(".play"))
        for line in (f"check {score}", f"retime {score} -o {play}", f"play {score} --to sim --retime"):
            click.echo(f"  drawcord {line}")
    return 0


def _is_demo(name: str) -> bool:
    """Whether a file of the package is a demo, not what Python keeps there."""
    return "." in name and not name.startswith((".", "_")) and not name.endswith((".py", ".pyc"))


def _quoted(path: Path) -> str:
    """A path as a shell takes it."""
    from shlex import quote

    return quote(str(path))
