"""A terminal as the front end of a run: arming, attending to it until it ends or is left, and its end told."""

import json
import os
import signal
import sys
from collections.abc import Callable
from typing import Any, Protocol

import click

from player.commands.signals import Interrupt, stopping
from player.commands.terminal import folded
from player.engine.clock import SteadyClock
from player.engine.process.client import Client, NotThere, Stranger, Unreadable
from player.engine.process.layout import Snapshot
from player.engine.process.start import Body, start

LOOK_S = 0.05
GONE = (
    "the process of the run is gone, so nothing is sent any more: boards that were armed vent by their own watchdog. "
    "Look at the rig before anything else"
)
NOT_FROM_HERE = "this front end only watches, and can vent: another one commands"
STANDS_S = 1.0
STANDS = "the process of the run stands still: what is asked of it is not done; vent by hand where need be"
LIVELY = ("playing", "paused", "resting")
STAYS = "to leave would bring all to rest, as the rule is rest: press r for that"


class Screen(Protocol):
    """What shows a run on the terminal, and has keys."""

    def show(self, snapshot: Snapshot, inputs: dict[str, Any]) -> None:
        """The latest of the run."""

    def tell(self, lines: tuple[str, ...]) -> None:
        """Lines for the operator."""

    def __enter__(self) -> "Screen": ...

    def __exit__(self, *_: object) -> None: ...


def commanded(
    client: Client, arm: bool, from_s: float, as_json: bool, screen: Callable[[Callable[[str], Any]], Screen], rule: str
) -> int:
    """A run that this command has started: pre-flight shown, armed, attended to; returns the exit code."""
    attending = Attending(client, rule)
    with stopping(attending.stop) as attending.interrupt:
        try:
            last = _armed(client, arm, from_s, attending.interrupt, as_json)
        except BaseException:
            _ended_before(client)
            raise
        if last is None and not client.gone:
            last = attending.attend(screen(attending.ask))
    return told(client, last, as_json, attending.left)


def begun(body: Body, about: dict[str, Any], rule: str, *arguments: Any, answers: bool) -> Client:
    """A run begun in a process of its own. Raises Faults where that does not come about."""
    from composer.faults import fault

    try:
        return start(body, about, rule, *arguments, answers=answers)
    except (NotThere, Stranger, Unreadable, OSError) as why:
        raise fault("the process of the run", f"did not begin: {why}", hint="nothing has moved; try again") from None


class Attending:
    """Attending to a run. rule: what becomes of it when left; left: this front end has left it."""

    def __init__(self, client: Client, rule: str):
        self.client, self.rule, self.left = client, rule, False
        self.interrupt: Interrupt | None = None
        self._screen: Screen | None = None
        self._now, self._stands = SteadyClock().now, False

    def attend(self, screen: Screen) -> tuple[str, dict[str, Any]] | None:
        """Show and tell until the run has ended; its last message, None where it is gone without, or left."""
        client, inputs = self.client, {}
        with screen:
            self._screen = screen
            while not client.gone and not self.left:
                for name, fields in client.hear(LOOK_S):
                    if name == "told":
                        screen.tell(_lines(fields))
                    elif name == "refused":
                        screen.tell((fields["why"],))
                    elif name == "command":
                        self.rule = fields["rule"]
                    elif name == "inputs":
                        inputs = fields
                    elif name in ("ended", "failed"):
                        screen.show(client.snapshot(), inputs)
                        return _after_close(client, (name, fields))
                snapshot = client.snapshot()
                screen.show(snapshot, inputs)
                self._watch(snapshot)
        return None

    def _watch(self, snapshot: Snapshot) -> None:
        """Say where a run that should move on stands still, which is nobody's but its process's fault."""
        stands = snapshot.state in LIVELY and self._now() - snapshot.number("at_s") > STANDS_S
        if stands and not self._stands:
            self._tell(STANDS)
        self._stands = stands

    def ask(self, what: str) -> None:
        """What a key asks for."""
        if what == "detach":
            if self.client.commands and self.rule == "rest":
                self._tell(STAYS)
            else:
                self.left = True
        elif what in ("hold", "held"):
            self.client.say("hold", down=what == "hold")
        elif what != "vent" and not self.client.commands:
            self._tell(NOT_FROM_HERE)
        else:
            self.client.say(what)

    def stop(self, _what: str) -> None:
        """What a signal asks for: a stop; where the terminal is gone, or this one watches, the run is left."""
        hung_up = self.interrupt is not None and self.interrupt.hung_up
        if not self.client.commands or (hung_up and self.rule != "rest"):
            self.left = True
        else:
            self.client.say("stop")

    def _tell(self, line: str) -> None:
        if self._screen is not None:
            self._screen.tell((line,))


def told(client: Client, last: tuple[str, dict[str, Any]] | None, as_json: bool, left: bool) -> int:
    """The end of a run, or of attending to it, on stdout and stderr; returns the exit code."""
    if left:
        client.leave()
        if as_json:
            click.echo(json.dumps({"ended": "left", "exit": 0, "run": client.run}))
        else:
            click.echo(f"left; the run is {client.run}, and 'drawcord attach {client.run}' comes back to it")
        return 0
    if last is None:
        client.close()
        if as_json:
            click.echo(json.dumps({"ended": "fault", "why": GONE, "exit": 1, "state": None}))
        click.echo(GONE, err=True)
        return 1
    name, fields = last
    if name == "failed":
        click.echo("\n".join(map(str, fields["lines"])), err=True)
    elif as_json:
        click.echo(json.dumps(fields["report"]))
    else:
        click.echo("\n".join(folded(str(line), sys.stdout) for line in fields["lines"]))
    return int(fields["exit"])


def _armed(client: Client, arm: bool, from_s: float, interrupt: Interrupt, as_json: bool) -> tuple[str, dict[str, Any]] | None:
    """See the pre-flight through and arm; the last message where the run did not come about."""
    while not client.gone:
        heard = client.hear(LOOK_S)
        while heard:
            name, fields = heard.pop(0)
            if name in ("ended", "failed"):
                return _after_close(client, (name, fields))
            if name == "told" and not as_json:
                click.echo("\n".join(_lines(fields)), err=True)
            if name == "marks":
                _show(fields, as_json)
                if fields["must_arm"] and not arm and not _asked_to_arm(client):
                    client.say("stop")
                    continue
                interrupt.become_stops()
                client.say("arm")
                client.say("play", from_s=from_s)
                client.put_back(heard)
                return None
    return None


def _show(fields: dict[str, Any], as_json: bool) -> None:
    """A mark a line; raises Faults with all that is not in order."""
    from composer.faults import Fault, Faults, Where
    from player.commands.marks import line
    from player.outputs.base import Mark

    marks = [Mark(**one) for one in fields["marks"]]
    wrong = [mark for mark in marks if not mark.ok]
    if wrong:
        raise Faults(
            Fault(Where("pre-flight"), f"not so: {mark.asked}" + (f": {mark.found}" if mark.found else ""), hint=mark.hint)
            for mark in wrong
        )
    if not as_json and fields["must_arm"]:
        for mark in marks:
            print(line(mark), file=sys.stderr)


def _asked_to_arm(client: Client) -> bool:
    """The operator's own deed, at the keyboard."""
    from composer.faults import fault
    from player.commands.front import ask_to_arm

    if not os.isatty(sys.stdin.fileno()) if sys.stdin else True:
        raise fault("--to", "a serial target has to be armed, and there is no terminal to ask at", hint="give --arm to arm it")
    return ask_to_arm(client.is_there)


def _ended_before(client: Client) -> None:
    """Nothing is armed, and nobody wants it any more: the run's process ends at once, and lets go of its ports."""
    import contextlib

    if client.pid and not client.gone:
        with contextlib.suppress(OSError):
            os.kill(client.pid, signal.SIGINT)
    _after_close(client, ("", {}))
    client.close()


def _after_close(client: Client, last: tuple[str, dict[str, Any]]) -> tuple[str, dict[str, Any]]:
    """The last message, once the run's process has let go of all that it held."""
    waits = 100
    while not client.gone and waits > 0:
        waits -= 1
        client.hear(LOOK_S)
    return last


def _lines(fields: dict[str, Any]) -> tuple[str, ...]:
    missed = int(fields["missed"])
    before = (f"... {missed} lines that did not get here",) if missed else ()
    return (*before, *map(str, fields["lines"]))
