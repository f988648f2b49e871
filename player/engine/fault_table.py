"""What can go wrong in a run, the state that it ends in, and what the operator hears: one table for the manual and the tests.

Each row is done for real by a test, with a board on a pseudo-terminal.
"""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Row:
    """happens: what goes wrong; mishap: the simulated board's name for it, "" where the test does it itself

    exit: the player's exit code; state: the player's at the end, "" where nothing was armed, or the player is gone
    ended: as the report has it; told: words that the operator hears; then: what the operator does
    """

    happens: str
    mishap: str
    exit: int
    state: str
    ended: str
    told: str
    then: str


ROWS = {
    "unplugged": Row(
        "a board is unplugged in mid-move",
        "",
        1,
        "idle",
        "fault",
        "has vanished",
        "plug it in, press b; or see to the cable first",
    ),
    "silent": Row(
        "a board neither hears nor says anything more",
        "silent",
        1,
        "vented",
        "fault",
        "nothing is heard from the board",
        "shut the supply by hand if its fibers stay up; it vents by its own watchdog",
    ),
    "garbage-1": Row(
        "one byte in a hundred is another one", "garbles", 0, "idle", "end", "", "nothing; the report counts them"
    ),
    "lost-1": Row("one byte in a hundred is lost", "loses", 0, "idle", "end", "", "nothing; the report counts them"),
    "garbage-all": Row(
        "every byte is another one", "noise", 2, "", "", "no answer to hello", "see to the cable and the baud rate"
    ),
    "echo": Row("the line sends back what it carries", "echoes", 0, "idle", "end", "", "nothing; the report counts them"),
    "slow-line": Row(
        "answers come 0.7 s late", "late-answers", 2, "", "", "its clock is known to within a tick", "look at the cable"
    ),
    "reset": Row("a board starts anew in mid-run", "resets", 1, "vented", "fault", "not armed", "look at its power; press b"),
    "fast-clock": Row("a board's clock is 1 % fast", "fast-clock", 0, "idle", "end", "", "nothing: it is allowed for"),
    "jumping-clock": Row(
        "a board's clock jumps", "jumping-clock", 1, "vented", "fault", "clock has jumped", "look at its power; press b"
    ),
    "over-pressure": Row(
        "a board finds over-pressure",
        "over-pressure",
        1,
        "vented",
        "fault",
        "over-pressure",
        "look at regulator and relief valve",
    ),
    "sensor": Row(
        "a board says that a sensor has failed", "sensor", 1, "vented", "fault", "sensor failed", "look at the sensor's plug"
    ),
    "other-rig": Row(
        "the board is set up for another rig",
        "wrong-rig",
        2,
        "",
        "",
        "set up for this rig",
        "play with the rig file that it has",
    ),
    "low-supply": Row(
        "the supply falls below its minimum", "low-supply", 1, "idle", "fault", "below its minimum", "look at the compressor"
    ),
    "stuck-valve": Row("a valve is stuck", "stuck-valve", 1, "idle", "fault", "does not move", "look at the valve"),
    "leak": Row("a fiber leaks", "leak", 1, "idle", "end", "falls while it should hold", "look at the fiber and its tube"),
    "railed": Row("a sensor reads full stroke", "railed", 1, "idle", "end", "at full stroke", "look at the sensor's plug"),
    "killed": Row(
        "the player is killed outright", "", -9, "", "", "", "the boards vent by their watchdogs; the log is whole up to there"
    ),
    "stopped-50-ms": Row("the machine stands still for 50 ms", "", 0, "idle", "end", "", "nothing: sets were sent ahead"),
    "stopped-500-ms": Row(
        "the machine stands still for 0.5 s",
        "",
        1,
        "vented",
        "fault",
        "heard nothing in time",
        "end what keeps the machine busy; press b",
    ),
    "log-full": Row(
        "the log's disk is full", "", 1, "idle", "end", "log could not be written", "make room; the log is whole up to there"
    ),
    "two-players": Row("two players want one port", "", 2, "", "", "the port is busy", "end the other one"),
}
"""Name of each: its row."""
