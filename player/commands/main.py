"""The command `drawcord`: a table of commands, each imported only when it is called, so that help comes at once."""

import os
import sys
from importlib import import_module

import click

COMMANDS = {
    "check": ("composer.commands.check", "Expand a score, check it, and report what the rig cannot do."),
    "retime": ("composer.commands.retime", "Change the times as little as possible, so that the rig can do the score."),
    "preview": ("composer.commands.preview", "Simulate how the fibers would really move."),
    "play": ("player.commands.play", "Play a score in real time."),
    "device": ("player.commands.device", "A simulated valve driver behind a pseudo-terminal."),
    "ports": ("player.commands.ports", "The ports found on this machine."),
    "rig": ("composer.commands.rig", "What each fiber of a rig can do where it hangs."),
    "demos": ("composer.commands.demos", "Copy the demo scores and rigs into a folder."),
}
"""Name of each command: its module, which defines `command`, and its line in the help."""


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

    def resolve_command(self, ctx: click.Context, args: list[str]) -> tuple[str | None, click.Command | None, list[str]]:
        """As click does, with the nearest known name for a misspelt one."""
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            from composer.faults import nearest

            hint = nearest(args[0], COMMANDS)
            ctx.fail(f"no command '{args[0]}'. " + (hint or "The commands are: " + ", ".join(COMMANDS) + "."))
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """The list in the help, from the table alone."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, line) for name, (_, line) in COMMANDS.items()])


@click.group(cls=Gathered, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(package_name="drawcord", prog_name="drawcord")
def drawcord() -> None:
    """Compose and play motion for arrays of fluid-driven fibers."""


def main() -> None:
    """Run the command line; whatever goes wrong ends in a sentence and an exit code, never a traceback."""
    sys.exit(run(sys.argv[1:]))


def run(arguments: list[str]) -> int:
    """Run one command; returns its exit code: 0 done, 1 snags or a fault in the run, 2 wrong input or call."""
    from composer.faults import Faults

    try:
        code = drawcord.main(args=arguments, prog_name="drawcord", standalone_mode=False)
        sys.stdout.flush()
        return code if isinstance(code, int) else 0
    except click.exceptions.Exit as end:
        return end.exit_code
    except click.ClickException as wrong:
        wrong.show()
        return 2
    except Faults as wrong:
        click.echo(str(wrong), err=True)
        return 2
    except (click.Abort, KeyboardInterrupt):
        click.echo("stopped", err=True)
        return 130
    except BrokenPipeError:
        # The reader of our output has gone; without this, Python would complain once more at exit.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except Exception as error:
        if os.environ.get("DRAWCORD_TRACEBACK"):
            raise
        trace = error.__traceback__
        while trace and trace.tb_next:
            trace = trace.tb_next
        at = f" ({trace.tb_frame.f_code.co_filename}:{trace.tb_lineno})" if trace else ""
        click.echo(
            f"drawcord met a fault of its own: {type(error).__name__}: {error}{at}\n"
            "   nothing half-written is left behind; DRAWCORD_TRACEBACK=1 shows the whole of it for a report",
            err=True,
        )
        return 2


if __name__ == "__main__":
    main()
