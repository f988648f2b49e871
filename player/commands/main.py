"""The command `drawcord`: a table of commands, each imported only when it is called, so that help comes at once."""

import os
import sys

COMMANDS = {
    "check": ("composer.commands.check", "Expand a score, check it, and report what the rig cannot do."),
    "retime": ("composer.commands.retime", "Change the times as little as possible, so that the rig can do the score."),
    "compose": ("composer.commands.compose", "Write a score in a window: text and cloth side by side."),
    "preview": ("composer.commands.preview", "Simulate how the fibers would really move."),
    "play": ("player.commands.play", "Play a score in real time."),
    "live": ("player.commands.live", "Play a rig by hand, or a score under the hands."),
    "rehearse": ("player.commands.rehearse", "Rehearse in a window: a run begun, or one that is on."),
    "attach": ("player.commands.attach", "Come back to a run whose terminal is gone, or watch one."),
    "device": ("player.commands.device", "A simulated valve driver behind a pseudo-terminal."),
    "tempo": ("player.commands.tempo", "Tempi and markers of a MIDI file as a score has them, and the way back."),
    "preflight": ("player.commands.preflight", "What must be true before arming, a line each."),
    "report": ("player.commands.report", "A run told afterwards, from its log."),
    "ports": ("player.commands.ports", "The ports found on this machine."),
    "rig": ("composer.commands.rig", "What each fiber of a rig can do where it hangs."),
    "take": ("player.commands.take", "What was played by hand, as a score."),
    "fit": ("composer.commands.fit", "A fiber type from what a bench measured."),
    "manual": ("player.commands.manual", "The manual, page by page."),
    "completion": ("player.commands.completion", "A script by which a shell completes commands, options and files."),
    "demos": ("composer.commands.demos", "Copy the demo scores and rigs into a folder."),
}
"""Name of each command: its module, which defines `command`, and its line in the help."""

HELP = ("-h", "--help")
VERSION = "--version"

COMPLETE = "_DRAWCORD_COMPLETE"
"""The variable by which shells ask what a word may become."""


def main() -> None:
    """Run the command line; whatever goes wrong ends in a sentence and an exit code, never a traceback."""
    code = run(sys.argv[1:])
    _deaf()
    sys.exit(code)


def run(arguments: list[str]) -> int:
    """Run one command; returns its exit code: 0 done, 1 snags or a fault in the run, 2 wrong input or call."""
    try:
        if os.environ.get(COMPLETE):
            from player.commands.gathered import call

            code = call([])  # a shell asks, by variables alone
        elif not arguments or arguments[0] in HELP:
            print(help_text())
            code = 0
        elif arguments[0] == VERSION:
            from player.commands.version import lines

            print("\n".join(lines()))
            code = 0
        else:
            from player.commands.gathered import call

            code = call(arguments)
        sys.stdout.flush()
        return code
    except KeyboardInterrupt:
        print("stopped", file=sys.stderr)
        return 130
    except BrokenPipeError:
        # The reader of our output has gone; without this, Python would complain once more at exit.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except Exception as error:
        if os.environ.get("DRAWCORD_TRACEBACK"):
            raise
        print(_own_fault(error), file=sys.stderr)
        return 2


def _deaf() -> None:
    """From here on Ctrl-C is not heard: all is done, and what was done would end as if it had been killed."""
    import signal

    signal.signal(signal.SIGINT, signal.SIG_IGN)


def help_text() -> str:
    """The help on the top level, from the table alone."""
    width = max(map(len, COMMANDS))
    rows = "\n".join(f"  {name:<{width}}  {says}" for name, (_, says) in COMMANDS.items())
    return (
        "Usage: drawcord COMMAND [OPTIONS] ...\n\n"
        "Compose and play motion for arrays of fluid-driven fibers.\n\n"
        f"Commands:\n{rows}\n\n"
        "Options:\n  -h, --help  This text; behind a command, all about that command.\n"
        "  --version   The version, and what else a report of a fault should tell."
    )


def _own_fault(error: Exception) -> str:
    """A fault of the program itself, with the place where it came up."""
    trace = error.__traceback__
    while trace and trace.tb_next:
        trace = trace.tb_next
    at = f" ({trace.tb_frame.f_code.co_filename}:{trace.tb_lineno})" if trace else ""
    return (
        f"drawcord met a fault of its own: {type(error).__name__}: {error}{at}\n"
        "   nothing half-written is left behind; DRAWCORD_TRACEBACK=1 shows the whole of it for a report"
    )


if __name__ == "__main__":
    main()
