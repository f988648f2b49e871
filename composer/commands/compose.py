"""`drawcord compose`: the window in which a score is written, seen and mended."""

import click


@click.command("compose")
@click.argument("score", metavar="[SCORE]", required=False, type=click.Path(path_type=str))
def command(score: str | None) -> int:
    """Write SCORE in a window: text and cloth side by side.

    Without SCORE the window opens on an unsaved copy of Estuary.
    """
    from composer.commands.screen import has_screen

    if not has_screen():
        raise click.UsageError("there is no screen here for a window; `drawcord check` and `drawcord preview` do without one.")
    if score is not None:
        from composer.editor import disk

        # Here, so that a wrong name is answered at once and on the terminal.
        disk.read_score(score)
    from composer.editor.start import run

    return run(score)
