"""A run's process, started by a front end: forked with all that is loaded already where that is safe, else begun anew.

The body of a run is a function of a module, `body(door, memory, *arguments)`; the arguments must be able to be pickled. It
returns the last message: its name and its fields.
"""

import mmap
import os
import pickle
import socket
import subprocess
import sys
import tempfile
import threading
import traceback
from collections.abc import Callable
from contextlib import suppress
from typing import Any

from composer.faults import Faults
from player.engine.clock import SteadyClock
from player.engine.process import layout
from player.engine.process.client import Client
from player.engine.process.door import Door
from player.engine.process.room import NoRoom, listen, name_for

Body = Callable[..., tuple[str, dict[str, Any]]]

BEGINS_S = 60.0
"""A process that is begun anew on a busy machine may want so long until it answers."""

_BEGUN_ANEW = "from player.engine.process.start import _begun; _begun()"


def start(body: Body, about: dict[str, Any], rule: str, *arguments: Any, answers: bool = False) -> Client:
    """Start a run, commanded by this process; `about` as `messages` has it, with "fibers", "boards" and "played" in it.

    The run outlives its starter by `rule`, of `messages.RULES`. Raises NotThere where it did not begin.
    """
    ours, theirs = socket.socketpair()
    given = (body, about, rule, arguments)
    try:
        # Threads of a numerics library put themselves to rest before a fork; Python's own would be lost in mid-step.
        if hasattr(os, "fork") and sys.platform != "darwin" and threading.active_count() == 1:
            _forked(given, ours, theirs)
        else:
            _spawned(given, theirs)
    except BaseException:
        ours.close()
        raise
    finally:
        theirs.close()
    return Client(ours, commands=True, answers=answers, patience_s=BEGINS_S)


def _forked(given: tuple, ours: socket.socket, theirs: socket.socket) -> None:
    sys.stdout.flush()
    sys.stderr.flush()
    if os.fork():
        return
    code = 2
    try:
        ours.close()
        os.setsid()
        nowhere = os.open(os.devnull, os.O_RDWR)
        for number in (0, 1, 2):
            os.dup2(nowhere, number)
        code = run(theirs, *given)
    finally:
        # Nothing that the starter has still to do is done twice.
        os._exit(code)


def _spawned(given: tuple, theirs: socket.socket) -> None:
    here = os.path.dirname(os.path.dirname(os.path.dirname(os.path.dirname(os.path.abspath(__file__)))))
    paths = [here, *filter(None, os.environ.get("PYTHONPATH", "").split(os.pathsep))]
    process = subprocess.Popen(
        [sys.executable, "-P", "-c", _BEGUN_ANEW, str(theirs.fileno())],
        stdin=subprocess.PIPE,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        pass_fds=[theirs.fileno()],
        start_new_session=True,
        env=os.environ | {"PYTHONPATH": os.pathsep.join(paths)},
    )
    assert process.stdin is not None
    with suppress(BrokenPipeError), process.stdin as pipe:
        pipe.write(pickle.dumps(given))
    # It is meant to outlive its starter: nobody waits for it.
    process.returncode = 0


def _begun() -> None:
    """The beginning of a process that was begun anew."""
    connection = socket.socket(fileno=int(sys.argv[1]))
    given = pickle.loads(sys.stdin.buffer.read())
    sys.exit(run(connection, *given))


def run(connection: socket.socket, body: Body, about: dict[str, Any], rule: str, arguments: tuple) -> int:
    """The whole of a run's process: a door, memory, the body, its last message. Returns the exit code."""
    name = name_for(about["played"])
    fibers, boards = len(about["fibers"]), len(about["boards"])
    descriptor, buffer = shared(layout.size_of(fibers, boards))
    alone = ""
    try:
        listener = listen(name)
    except NoRoom as why:
        listener, alone = None, str(why)
    door = Door(name, about, _read_only(descriptor), rule, listener, SteadyClock().now)
    door.adopt(connection)
    memory = layout.Writer(buffer, fibers, boards)
    memory.show()
    door.await_hello()
    try:
        if alone:
            door.tell((f"nobody can attach to this run: {alone}",))
        last, fields = body(door, memory, *arguments)
    except Faults as wrong:
        last, fields = "failed", {"exit": 2, "lines": [str(wrong)]}
    except KeyboardInterrupt:
        last, fields = "failed", {"exit": 130, "lines": ["stopped"]}
    except Exception as error:
        last, fields = "failed", {"exit": 2, "lines": _own_fault(error)}
    door.finish(last, **fields)
    return int(fields["exit"])


def shared(size: int) -> tuple[int, mmap.mmap]:
    """Memory that has no name, as a descriptor to hand on, and mapped here."""
    if hasattr(os, "memfd_create"):
        descriptor = os.memfd_create("drawcord", os.MFD_CLOEXEC)
    else:
        descriptor, path = tempfile.mkstemp(prefix="drawcord-")
        os.unlink(path)
    os.ftruncate(descriptor, size)
    return descriptor, mmap.mmap(descriptor, size, mmap.MAP_SHARED)


def _read_only(descriptor: int) -> int:
    """The same memory, for those who are to look at it only; the same descriptor where the system cannot make another."""
    try:
        return os.open(f"/proc/self/fd/{descriptor}", os.O_RDONLY | os.O_CLOEXEC)
    except OSError:
        return descriptor


def _own_fault(error: Exception) -> list[str]:
    if os.environ.get("DRAWCORD_TRACEBACK"):
        return traceback.format_exception(error)
    last = traceback.extract_tb(error.__traceback__)[-1:]
    at = f" ({last[0].filename}:{last[0].lineno})" if last else ""
    return [
        f"drawcord met a fault of its own: {type(error).__name__}: {error}{at}",
        "   whatever was armed has been vented; DRAWCORD_TRACEBACK=1 shows the whole of it for a report",
    ]
