"""The ways to a run that the rehearse window is given: begun from the command line's words, or attached to."""

import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import click

from composer.faults import Faults, fault
from player.commands import live_process, play_process
from player.commands.live_setup import RIG_ENDING, checked
from player.commands.mending import NotMended
from player.commands.play import _check_written, _rate, _refuse_clashes
from player.commands.played import Played, load_played
from player.commands.refusal import not_mended, refused
from player.engine.process.client import Client, NotThere
from player.engine.process.room import NoRoom, path_of, runs
from player.engine.process.start import Body, start
from player.live.takes import SUFFIX
from player.window.link import WRONG
from player.window.ways import Made, Material, RunRow, Ways

SLOWEST_SIM_HZ = 200.0


def names() -> list[str]:
    """This user's runs. Raises Faults."""
    try:
        return list(runs())
    except NoRoom as why:
        raise fault("rehearse", f"runs cannot be looked for: {why}") from None


def attaching(watch: bool, rig: str | None) -> Ways:
    """Ways to runs that are on."""
    return Ways(None, lambda name: attached(name, watch, rig), rows, simulated, composed)


def beginning(
    *, score: str, targets: tuple[str, ...], map_path: str | None, midi: tuple[str, ...], osc: str | None, take: str | None,
    start: str | None, rate: float | None, mend: bool, log: str | None, rig: str | None, rule: str,
) -> Ways | int:  # fmt: skip
    """Ways to a new run, everything about it read and checked; an exit code where it is refused. Raises Faults."""
    if not targets:
        raise click.UsageError("where to? Add --to sim, --to serial:PORT[@BAUD] or --to file:PATH")
    by_hand = bool(map_path or midi or osc or take) or score.endswith(RIG_ENDING)
    if by_hand:
        if mend:
            raise click.UsageError("--retime is for a score alone: by hand, the governor does what the rig can do")
        begin, from_s = _live(score, targets, map_path, midi, osc, take, start, rate, log, rig, rule)
    else:
        try:
            played = load_played(score, rig, mend)
        except NotMended as why:
            return not_mended(score, str(why), False)
        _check_written(targets, log, score, rig)
        _refuse_clashes([played.rig.file, *played.used], targets, log)
        hertz = _rate(rate, played.recording.rate_Hz if played.recording else 200.0)
        from_s = played.seconds_of(start) if start is not None else 0.0
        if played.tracks is not None and (code := refused(played, False)) is not None:
            return code
        begin = _play(played, targets, hertz, log, rule)
    return Ways(
        begin, lambda name: attached(name, False, rig), rows, simulated, composed, from_s, f"{score} to {' '.join(targets)}"
    )


def _play(played: Played, targets: tuple[str, ...], hertz: float, log: str | None, rule: str) -> Callable[[], Made]:
    material = _material(played)

    def begin() -> Made:
        return _begun(
            play_process.body, play_process.about(played, targets, hertz), rule, played, targets, hertz, log, False
        ), lambda: material

    return begin


def _live(
    score: str, targets: tuple[str, ...], map_path: str | None, midi: tuple[str, ...], osc: str | None, take: str | None,
    start: str | None, rate: float | None, log: str | None, rig: str | None, rule: str,
) -> tuple[Callable[[], Made], float]:  # fmt: skip
    def call(out: str | None) -> Any:
        # A map that is not there yet is made by the first control that is bound; the next beginning reads what it then is.
        there = map_path if map_path and os.path.exists(map_path) else None
        return checked(
            score=score, targets=targets, map_path=there, midi=midi, osc=osc, osc_to=None, take=out, follow=None,
            send_clock=None, start=start, rate=rate, log=log, rig=rig, learn=None, hands=False,
        )  # fmt: skip

    first = call(take)

    def begin() -> Made:
        made = call(_free_take(take) if take else None)
        material = replace(
            _material(made.played), score=made.loaded.score if made.loaded else None, map_path=map_path or "",
            take_path=made.take or "",
        )  # fmt: skip
        return _begun(live_process.body, live_process.about(made), rule, made, True), lambda: material

    return begin, first.start_s


def _free_take(out: str) -> str:
    """The score of a take, or the same with a number where that has been recorded: each beginning has takes of its own."""
    stem, ending = os.path.splitext(out)
    number, path = 1, out
    while os.path.exists(os.path.splitext(path)[0] + SUFFIX) or (number > 1 and os.path.exists(path)):
        number += 1
        path = f"{stem}-again-{number}{ending}"
    return path


def _begun(body: Body, about: dict[str, Any], rule: str, *arguments: Any) -> Client:
    return start(body, about, rule, *arguments, answers=True)


def _material(played: Played) -> Material:
    written = played.kind in ("score",)
    return Material(
        played.rig, played.abilities, played.tempo, played.warp, played.tracks, score_path=played.path if written else ""
    )


def attached(name: str, watch: bool, rig: str | None) -> Made:
    """Attach to a run, and read what it plays as far as that is still there."""
    client = Client.at(path_of(name), commands=not watch, answers=not watch)
    return client, lambda: _material_of(client.about, rig)


def _material_of(about: dict[str, Any], rig: str | None) -> Material:
    from composer.limits.abilities import abilities_of
    from composer.load import load_rig

    folder = about.get("folder", "")

    def here(path: str) -> str:
        return os.path.normpath(os.path.join(folder, path)) if path else ""

    material = Material(map_path=here(about.get("map", "")), take_path=here(about.get("take", "")))
    try:
        loaded = load_rig(rig or here(about["rig"]))
        material = replace(material, rig=loaded, abilities=abilities_of(loaded))
        if about["duration_s"] <= 0.0:
            return material
        played = load_played(here(about["played"]), rig or here(about["rig"]), False)
    except Faults as wrong:
        return replace(material, note=f"what the run plays cannot be read any more: {wrong}")
    if played.tracks is None or abs(played.tracks.duration_s - about["duration_s"]) > 1e-6:
        note = f"{about['played']} is not timed as this run is, so the way to a cue is told in seconds"
        return replace(material, note=note if played.tracks is not None else "")
    score = None
    if played.kind == "score" and about["kind"] == "live":
        from composer.load import load_score

        score = load_score(played.path, loaded).score
    return replace(
        material, tempo=played.tempo, warp=played.warp, tracks=played.tracks, score=score,
        score_path=played.path if played.kind == "score" else "",
    )  # fmt: skip


def rows() -> list[RunRow]:
    """The runs that are on, each in a few words."""
    found = []
    for name in names():
        try:
            client = Client.at(path_of(name), commands=False)
        except NotThere:
            # It has ended in between.
            continue
        except WRONG as why:
            found.append(RunRow(name, str(why)))
            continue
        now, about = client.snapshot(), client.about
        who = "commanded elsewhere" if now.number("commanded") else "nobody commands it"
        found.append(
            RunRow(name, f"{now.state} at {now.text('place')}, {about['title']} to {' '.join(about['targets'])}, {who}")
        )
        client.leave()
    return found


def simulated(path: str) -> Made:
    """A score on the simulator, as a run of its own that nobody has to rest."""
    played = load_played(path, None, False)
    about = play_process.about(played, ("sim",), SLOWEST_SIM_HZ)
    return _begun(play_process.body, about, "rest", played, ("sim",), SLOWEST_SIM_HZ, None, False), lambda: _material(played)


def composed(path: str) -> str:
    """Open a score in the compose window, a process of its own; why not."""
    call = [sys.executable, "-P", "-m", "player.commands.main", "compose", path]
    try:
        subprocess.Popen(
            call, stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, start_new_session=True,
            env=os.environ | {"PYTHONPATH": os.pathsep.join([_home(), *filter(None, [os.environ.get("PYTHONPATH")])])},
        )  # fmt: skip
    except OSError as why:
        return f"compose could not be opened: {why}"
    return "opened in compose"


def _home() -> str:
    return os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
