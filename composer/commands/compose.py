"""`drawcord compose`: the window in which a score is written, seen and mended."""

import os

import click


@click.command("compose")
@click.argument("score", metavar="[SCORE]", required=False, type=click.Path(path_type=str))
def command(score: str | None) -> int:
    """Write SCORE in a window: text and cloth side by side.

    A SCORE that is not there yet is begun; without SCORE the window opens on an unsaved copy of Estuary.
    """
    from composer.commands.screen import has_screen

    if not has_screen():
        raise click.UsageError("there is no screen here for a window; `drawcord check` and `drawcord preview` do without one.")
    if score is not None:
        from composer.editor import disk
        from composer.faults import fault
        from composer.files import check_writable

        # Here, so that a wrong name is answered at once and on the terminal.
        if os.path.lexists(score):
            disk.read_score(score)
        elif score.lower().endswith(".score"):
            check_writable(score)
        else:
            raise fault(score, "there is no such file", "a score, or the name of one to begin, such as NAME.score")
    from composer.editor.start import run

    return run(score)
