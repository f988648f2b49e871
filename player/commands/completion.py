"""`drawcord completion`: the script that a shell reads, so that it can ask what a word may become."""

import click

SHELLS = ("bash", "zsh", "fish")


@click.command("completion")
@click.argument("shell", type=click.Choice(SHELLS))
def command(shell: str) -> int:
    """Print the script by which SHELL completes the commands of drawcord, their options and their files.

    \b
    bash, a line in ~/.bashrc:  eval "$(drawcord completion bash)"
    zsh, a line in ~/.zshrc:    eval "$(drawcord completion zsh)"
    fish, once:  drawcord completion fish > ~/.config/fish/completions/drawcord.fish
    """
    from click.shell_completion import ShellComplete, get_completion_class

    from player.commands.gathered import drawcord
    from player.commands.main import COMPLETE

    made = get_completion_class(shell)
    assert made is not None
    # Not made.source(), which would run the shell to see how old it is.
    click.echo(ShellComplete.source(made(drawcord, {}, "drawcord", COMPLETE)))
    return 0
