"""What can go wrong in a run, the state that it ends in, and what the operator hears: one table for the manual and the tests.

Each row is done for real by a test, with a board on a pseudo-terminal.
"""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Row:
    """happens: what goes wrong; mishap: the simulated board's name for it, "" where the test does it itself

    exit: the player's exit code; state: the player's at the end, "" where nothing was armed, or the player is gone, "one or
    another" where chance decides
    ended: as the report has it; told, then: words of the sentence that the operator hears: what has happened, what to do
    Where chance decides, these have several, with " / " between them. Where nothing is heard, `then` says
    what there is to know.
    """

    happens: str
    mishap: str
    exit: int
    state: str
    ended: str
    told: str
    then: str


PLAYED = (0, "idle", "end", "")
"""Exit, state, end and words of a run in which nothing was seen of it."""
COUNTED = "nothing; the report counts what was lost"
CHANGED = "nothing: it is as the operator wishes"

LINE = {
    "unplugged": Row("a board is unplugged in mid-move", "", 1, "idle", "fault", "has vanished", "look at its plug and cable"),
    "silent": Row(
        "a board neither hears nor says anything more",
        "silent",
        1,
        "vented",
        "fault",
        "nothing is heard from the board",
        "look at its power and cable, and shut its supply by hand if its fibers stay up",
    ),
    "garbage-1": Row("one byte in a hundred is another one", "garbles", *PLAYED, COUNTED),
    "lost-1": Row("one byte in a hundred is lost", "loses", *PLAYED, COUNTED),
    "cut": Row("frames are cut off anywhere, one in twenty", "cuts", *PLAYED, COUNTED),
    "garbage-10": Row(
        "one byte in ten is another one", "garbles-much", 2, "", "", "no answer to hello", "is this its port and baud rate?"
    ),
    "garbage-10-later": Row(
        "one byte in ten is another one, from mid-run on",
        "garbles-later",
        1,
        "idle or vented",
        "fault",
        "the line garbles / heard nothing in time / has vented",
        "look at its plug and cable / look at its line / look at its power and line",
    ),
    "garbage-all": Row(
        "every byte is another one", "noise", 2, "", "", "no answer to hello", "is this its port and baud rate?"
    ),
    "garbage-all-later": Row(
        "every byte is another one, from mid-run on",
        "noise-later",
        1,
        "vented",
        "fault",
        "nothing is heard from the board",
        "look at its power and cable, and shut its supply by hand if its fibers stay up",
    ),
    "echo": Row("the line sends back what it carries", "echoes", *PLAYED, COUNTED),
    "slow-line": Row(
        "answers come 0.7 s late",
        "late-answers",
        2,
        "",
        "",
        "its clock is known well enough to land within a tick",
        "the line is slow or disturbed: look at the cable, or play at a lower --rate",
    ),
}
"""What a line may do."""

BOARD = {
    "reset": Row(
        "a board starts anew in mid-run",
        "resets",
        1,
        "vented",
        "fault",
        "not armed / clock has jumped",
        "look at its power: it may have started anew / look at its power and line",
    ),
    "fast-clock": Row("a board's clock is 1 % fast", "fast-clock", *PLAYED, "nothing: it is allowed for"),
    "jumping-clock": Row(
        "a board's clock jumps", "jumping-clock", 1, "vented", "fault", "clock has jumped", "look at its power"
    ),
    "mute": Row("a board never says a word", "mute", 2, "", "", "no answer to hello", "is it powered"),
    "other-rig": Row(
        "the board is set up for another rig (fault 2)",
        "wrong-rig",
        2,
        "",
        "",
        "set up for this rig",
        "or play with the rig file that it has",
    ),
    "few-channels": Row(
        "the board has fewer channels than the rig uses",
        "few-channels",
        2,
        "",
        "",
        "the channels that the rig uses",
        "connect the board that this rig was made for",
    ),
    "bad-command": Row(
        "a board hears a command that makes no sense (fault 4)",
        "misreads",
        1,
        "idle",
        "fault",
        "did not understand what it was sent",
        "look at its line, and at which version of the wire protocol it speaks",
    ),
    "queue-full": Row(
        "a board's queue is full (fault 5)", "full-queue", 1, "idle", "end", "queue was full", "play at a lower --rate"
    ),
    "over-pressure": Row(
        "a board finds over-pressure (fault 6)",
        "over-pressure",
        1,
        "vented",
        "fault",
        "more pressure than a fiber may have",
        "look at regulator and relief valve",
    ),
    "sensor": Row(
        "a board says that a sensor has failed (fault 7)",
        "sensor",
        1,
        "vented",
        "fault",
        "does not answer as it should",
        "look at the sensor's plug and cable",
    ),
}
"""What a board may do."""

AIR = {
    "low-supply": Row(
        "the supply falls below its minimum",
        "low-supply",
        1,
        "idle",
        "fault",
        "below its minimum",
        "look at compressor, receiver and regulator",
    ),
    "stuck-valve": Row(
        "a valve is stuck", "stuck-valve", 1, "idle", "fault", "does not move", "look at the valve, its plug and the tube"
    ),
    "leak": Row(
        "a fiber leaks", "leak", 1, "idle", "end", "falls while it should hold", "look for a leak at the fiber and its tube"
    ),
    "railed": Row(
        "a sensor reads full stroke", "railed", 1, "idle", "end", "at full stroke", "look at the sensor's plug and cable"
    ),
}
"""What fibers, valves, sensors and the supply may do."""

_STOOD = "look at its line, and end what keeps this machine busy"

HOST = {
    "killed": Row(
        "the player is killed outright", "", -9, "", "", "", "its boards vent by their watchdogs; the log is whole up to there"
    ),
    "front-killed": Row(
        "the front end of a run is killed outright",
        "",
        -9,
        "",
        "",
        "",
        "all come to rest or vent; the log is whole up to there",
    ),
    "stopped-50-ms": Row("the machine stands still for 50 ms", "", *PLAYED, "nothing: sets were sent ahead"),
    "stopped-500-ms": Row(
        "the machine stands still for 0.5 s (fault 1)", "", 1, "vented", "fault", "heard nothing in time", _STOOD
    ),
    "stopped-5-s": Row("the machine stands still for 5 s", "", 1, "vented", "fault", "heard nothing in time", _STOOD),
    "log-full": Row(
        "the log's disk is full", "", 1, "idle", "end", "the log could not be written to its end", "make room on its disk"
    ),
    "two-players": Row("two players want one port", "", 2, "", "", "the port is busy", "end that program, then try again"),
    "power-lost": Row(
        "power is lost while a play file is written",
        "",
        -9,
        "",
        "",
        "",
        "the file that was there is whole, or the new one is; write it again",
    ),
}
"""What the machine may do that plays."""

_VENTED = (1, "vented", "vented", "Vented")
_STOPPED = (0, "idle", "stopped", "Stopped and brought to rest")

OPERATOR = {
    "vent-asked": Row("vent is pressed at the question whether to arm", "", 2, "", "", "not armed", "nothing has moved"),
    "vent-playing": Row("vent is pressed while playing", "", *_VENTED, CHANGED),
    "vent-paused": Row("vent is pressed while paused", "", *_VENTED, CHANGED),
    "vent-resting": Row("vent is pressed on the way to rest", "", *_VENTED, CHANGED),
    "vent-standing-by": Row(
        "vent is pressed after a fault, all at rest", "", 1, "vented", "fault", "Ended by a fault", "the run is over"
    ),
    "stop-asked": Row("Ctrl-C at the question whether to arm", "", 130, "", "", "stopped", "nothing has moved"),
    "stop-playing": Row("Ctrl-C while playing", "", *_STOPPED, CHANGED),
    "stop-paused": Row("Ctrl-C while paused", "", *_STOPPED, CHANGED),
    "stop-resting": Row("Ctrl-C on the way to rest", "", *_VENTED, CHANGED),
    "stop-standing-by": Row("Ctrl-C after a fault, all at rest", "", 1, "idle", "fault", "Ended by a fault", "the run is over"),
}
"""What the operator may do at any moment."""

ROWS = LINE | BOARD | AIR | HOST | OPERATOR
"""Name of each: its row."""
