"""`drawcord attach`: this user's runs, and a terminal for one of them."""

import json

import click


@click.command("attach")
@click.argument("run", metavar="[RUN]", required=False)
@click.option("--list", "lists", is_flag=True, help="List the runs, and do nothing else.")
@click.option("--watch", is_flag=True, help="Only watch, and vent where need be; do not command.")
@click.option("--vent", is_flag=True, help="Vent: that run, or every one of yours where none is named.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object at the end, and nothing else.")
def command(run: str | None, lists: bool, watch: bool, vent: bool, as_json: bool) -> int:
    """Come back to a run whose terminal is gone, or watch one.

    RUN is its name, as --list has it; it may be left out where there is only one. Whoever comes first commands; everybody else
    watches. Each one can vent. Ctrl-C brings a run to rest that is commanded from here; while watching it only leaves.

    Exit code: 0 it went as the operator wished, or was left; 1 the run ended in a fault or a vent; 2 there is no such run.
    """
    from player.engine.process.client import Client
    from player.engine.process.room import path_of

    if vent:
        return _vent([run] if run else _names(), as_json)
    if lists:
        return _list(as_json)
    names = [run] if run else _names()
    if len(names) != 1:
        raise _which(names)
    try:
        client = Client.at(path_of(names[0]), commands=not watch, answers=not as_json and _answers())
    except _errors() as why:
        raise _no_run(names[0], why) from None
    return _attended(client, watch, as_json)


def _attended(client, watch: bool, as_json: bool) -> int:
    from player.commands.attending import Attending, told
    from player.commands.signals import stopping

    live = client.about["kind"] == "live"
    if live:
        from player.commands.live_front import LiveFront as Screen
    else:
        from player.commands.front import Front as Screen
    attending = Attending(client, "rest")
    with stopping(attending.stop) as attending.interrupt:
        attending.interrupt.become_stops()
        if not as_json:
            click.echo(_greeting(client, watch), err=True)
        last = attending.attend(Screen(attending.ask, client.about, quiet=as_json))
    return told(client, last, as_json, attending.left)


def _greeting(client, watch: bool) -> str:
    of = f"{client.run}: {client.about['title']}"
    if client.commands:
        return f"{of}; it is commanded from here now"
    return f"{of}; only watched" + ("" if watch else ", as another front end commands it")


def _vent(names: list[str], as_json: bool) -> int:
    """Every run of those names told to vent, before anything else is waited for."""
    from player.engine.process.client import Client
    from player.engine.process.room import path_of

    if not names:
        raise _which(names)
    clients, wrong = [], []
    for name in names:
        try:
            clients.append(Client.at(path_of(name), commands=False, vents=True))
        except _errors() as why:
            wrong.append((name, why))
    rows = [{"run": client.run, "state": _vented(client)} for client in clients]
    for client in clients:
        client.close()
    if as_json:
        click.echo(json.dumps({"runs": rows}))
    else:
        for row in rows:
            click.echo(f"{row['run']}: {row['state']}")
    if wrong:
        raise _no_run(*wrong[0])
    return 0 if all(row["state"] == "vented" for row in rows) else 1


def _vented(client) -> str:
    """The run's state, once it has vented, is over, or does not say so for a while."""
    waits = 60
    while waits > 0 and not client.gone and client.snapshot().state != "vented":
        waits -= 1
        if any(name == "ended" for name, _ in client.hear(0.05)):
            break
    state = client.snapshot().state
    return "its process is gone" if client.gone and state != "vented" else state


def _list(as_json: bool) -> int:
    from player.engine.process.client import Client
    from player.engine.process.room import path_of

    rows = []
    for name in _names():
        try:
            client = Client.at(path_of(name), commands=False)
        except _errors():
            continue
        now, about = client.snapshot(), client.about
        rows.append(
            {
                "run": client.run, "pid": client.pid, "kind": about["kind"], "title": about["title"], "played": about["played"],
                "targets": about["targets"], "began": about["began"], "state": now.state, "place": now.text("place"),
                "commanded": bool(now.number("commanded")),
            }
        )  # fmt: skip
        client.close()
    if as_json:
        click.echo(json.dumps({"runs": rows}))
        return 0
    if not rows:
        click.echo("none of your runs is on")
    for row in rows:
        who = "commanded" if row["commanded"] else "nobody commands it"
        click.echo(f"{row['run']}  {row['state']} at {row['place']}  {row['title']}  to {' '.join(row['targets'])}  ({who})")
    return 0


def _names() -> list[str]:
    from composer.faults import fault
    from player.engine.process.room import NoRoom, runs

    try:
        return list(runs())
    except NoRoom as why:
        raise fault("attach", f"runs cannot be looked for: {why}") from None


def _which(names: list[str]):
    from composer.faults import fault

    if not names:
        return fault("attach", "none of your runs is on", hint="start one with 'drawcord play' or 'drawcord live'")
    return fault("attach", "several runs are on: " + ", ".join(names), "the name of one of them")


def _no_run(name: str, why: Exception):
    from composer.faults import fault, nearest

    names = _names()
    hint = nearest(name, names) or ("'drawcord attach --list' lists your runs" if names else "none of your runs is on")
    return fault(f"attach {name}", str(why), hint=hint)


def _errors() -> tuple[type[Exception], ...]:
    from player.engine.process.client import NotThere, Stranger, Unreadable
    from player.engine.process.room import NoRoom

    return NotThere, Stranger, Unreadable, NoRoom


def _answers() -> bool:
    from player.commands.terminal import has_keys, is_screen

    return is_screen() and has_keys()
