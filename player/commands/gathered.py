"""All commands as one, for click; imported only once a command is really called."""

from importlib import import_module

import click
from click.shell_completion import CompletionItem

from composer.faults import Faults, nearest
from player.commands.main import COMMANDS, help_text


class Gathered(click.Group):
    """The commands of both packages, imported one at a time."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """All names, in the table's order."""
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, name: str) -> click.Command | None:
        """The command of that name, its module imported now."""
        if name not in COMMANDS:
            return None
        return import_module(COMMANDS[name][0]).command

    def shell_complete(self, ctx: click.Context, incomplete: str) -> list[CompletionItem]:
        """The names that a word may become, from the table alone; click would import every command for its help."""
        names = [CompletionItem(name, help=says) for name, (_, says) in COMMANDS.items() if name.startswith(incomplete)]
        return names + click.Command.shell_complete(self, ctx, incomplete)

    def resolve_command(self, ctx: click.Context, args: list[str]) -> tuple[str | None, click.Command | None, list[str]]:
        """As click does, with the nearest known name for a misspelt one."""
        if not ctx.resilient_parsing and args and args[0] not in COMMANDS and not args[0].startswith("-"):
            hint = nearest(args[0], COMMANDS)
            ctx.fail(f"no command '{args[0]}'; " + (hint or "the commands are: " + ", ".join(COMMANDS) + "."))
        return super().resolve_command(ctx, args)

    def get_help(self, ctx: click.Context) -> str:
        """The help that is given without click too."""
        return help_text()


@click.group(cls=Gathered, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(package_name="drawcord", prog_name="drawcord")
def drawcord() -> None:
    """Compose and play motion for arrays of fluid-driven fibers."""


def call(arguments: list[str]) -> int:
    """Run one command; what is wrong with the call, or with what it was given, is told on stderr. Returns the exit code."""
    try:
        code = drawcord.main(args=arguments, prog_name="drawcord", standalone_mode=False)
        return code if isinstance(code, int) else 0
    except click.exceptions.Exit as end:
        return end.exit_code
    except click.ClickException as wrong:
        wrong.show()
        return 2
    except Faults as wrong:
        click.echo(str(wrong), err=True)
        return 2
    except click.Abort:
        raise KeyboardInterrupt from None
