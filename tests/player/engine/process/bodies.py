"""Bodies of runs for tests: functions of a module, as a process that is begun anew needs them."""

import os
import signal

from composer.faults import fault


def echoes(door, memory, word):
    """Waits for a stop, and says what it was given, and who it is."""
    asked = []
    door.take = lambda name, fields: asked.append(name) or ""
    while "stop" not in asked and door.commanded:
        door.serve()
        memory.slot["position_s"] = 4.5
        memory.show()
    told = {"word": word, "pid": os.getpid(), "session": os.getsid(0), "out": os.ttyname(1) if os.isatty(1) else "nowhere"}
    return "ended", {"exit": 0, "report": told, "lines": [word]}


def outlives(door, memory, path):
    """Goes on until its front end is gone, then writes that it has seen so."""
    gone = []
    door.left = lambda: gone.append(door.rule)
    while not gone:
        door.serve()
    with open(path, "w") as file:
        file.write(f"{gone[0]} {door.commanded}")
    return "ended", {"exit": 0, "report": {}, "lines": []}


def wrong(door, memory):
    """Finds a file wrong."""
    raise fault("bench.rig.toml", "it has no fibers")


def broken(door, memory):
    """A fault of the program's own."""
    raise ZeroDivisionError("of its own")


def killed(door, memory):
    """Is killed before it has said a thing."""
    os.kill(os.getpid(), signal.SIGKILL)
