"""Everything that the window does by key, in one table: keys, buttons, their hints and the sheet of keys read its rows."""

from dataclasses import dataclass
from typing import Any

from player.engine.process.messages import ASKED, DISARMED, why_not


@dataclass(frozen=True, slots=True)
class Action:
    """Something that can be done: name, word on its button, key as Qt writes it, what it does; held: for one second, or while.

    asks: the message of `player.engine.process.messages.ASKED` that it is; "" for what the window does by itself
    """

    name: str
    word: str
    keys: tuple[str, ...]
    says: str
    asks: str = ""
    held: bool = False


ACTIONS = {
    row.name: row
    for row in (
        Action("vent", "VENT", ("Escape", "V"), "every valve exhausts, at once; Escape also while writing, and in any dialog",
               "vent"),
        Action("arm", "Arm", ("A",), "hold for one second: arm the boards; after a vent or a rest, arm and go on", "arm", True),
        Action("turn", "Play or pause", ("Space",), "play once armed; while playing pause, and then go on", "play"),
        Action("play", "Play", (), "play from the start, once armed", "play"),
        Action("pause", "Pause", ("P",), "stand still, all fibers hold", "pause"),
        Action("go_on", "Go on", ("Return", "Enter"),
               "go on from a pause, or a cue that waits; presses a button that Tab has gone to", "go_on"),
        Action("next_cue", "Next cue", ("N",), "go to the next cue", "next_cue"),
        Action("rest", "Rest", ("R",), "all down at their safe rate, then disarmed", "rest"),
        Action("jump", "Go there", ("J",), "play from the cue chosen beside it, or go there while playing", "jump"),
        Action("preflight", "Ask again", ("Y",), "the pre-flight once more", "preflight"),
        Action("hold", "Hold to run", ("H",), "while held, a worn rig runs", "hold", True),
        Action("let_go", "Hands off", ("L",), "all hands let go: the score has every fiber again", "let_go"),
        Action("record", "Record", ("T",), "begin a take, or end it", "record"),
        Action("command", "Take command", ("O",), "command this run, where no other window or terminal does", "command"),
        Action("again", "Begin again", ("B",), "after the end: the same run from its pre-flight on"),
        Action("panel_1", "Meters", ("1",), "groups, and what the governor cuts"),
        Action("panel_2", "Pre-flight", ("2",), "what must be true before arming, and tonight's margins"),
        Action("panel_3", "Takes", ("3",), "what was recorded, played back on the simulator or sent to compose"),
        Action("panel_4", "Map", ("4",), "which control does what; bind one by moving it"),
        Action("view", "View", ("C",), "see the rig from the front, the side, three-quarter"),
        Action("dim", "Dim", ("D",), "less light, and least; then full light again; from the light look to the dark one"),
        Action("theme", "Light or dark", ("Ctrl+D",), "the other look"),
        Action("keys", "Keys", ("F1", "?"), "this sheet"),
        Action("close", "Close", ("Ctrl+Q",), "close the window; the run goes by its rule"),
    )
}  # fmt: skip

BY_KEY = {key: row for row in ACTIONS.values() for key in row.keys}
"""The action of each key."""

NO_RUN = "no run is attached"
OVER = "the run is over"
WATCHES = "this window only watches, and can vent: another one commands"
NOBODY = "this window only watches; nobody commands: 'Take command' does"
NOT_SO = "the pre-flight is not in order: see its list"
ASKED_NOW = "the pre-flight is not done yet"
NO_TAKES = "nothing is recorded: begin with --take OUT.score"
NO_HANDS = "only where a hand plays: begin with --map, --midi or --osc"
NO_SCORE = "a rig alone has no score"


@dataclass(frozen=True, slots=True)
class Standing:
    """What decides which actions make sense.

    stage: "none", "before" (arming), "running", "over" (ended, failed or gone)
    state: of player.engine.safety; marks: None while the pre-flight is asked, else whether all is in order
    """

    stage: str = "none"
    state: str = "idle"
    commands: bool = False
    taken: bool = False
    marks: bool | None = None
    live: bool = False
    takes: bool = False
    holds: bool = False
    scored: bool = True
    again: bool = False


def why_not_now(name: str, now: Standing) -> str:
    """Why an action cannot be done now, for the operator; "" where it can."""
    row = ACTIONS[name]
    if name == "again":
        return _why_not_again(now)
    if not row.asks:
        return ""
    if now.stage == "none":
        return NO_RUN
    if now.stage == "over":
        return OVER
    if name == "vent":
        return ""
    if name == "command":
        return "it is commanded from here" if now.commands else WATCHES if now.taken else ""
    if not now.commands:
        return WATCHES if now.taken else NOBODY
    return _why_not_own(name, now) or _by_table(name, now)


OTHER_WORDS = {("arm", "bring_back"): "Arm, go on", ("jump", "play"): "Play from"}
"""Words on buttons that stand for another message than usual."""


def message_of(name: str, now: Standing) -> str:
    """Which message of ASKED an action is just now."""
    if name == "arm" and now.stage == "running":
        return "bring_back"
    if name == "turn" and now.state == "playing":
        return "pause"
    if name == "turn" and now.state == "paused":
        return "go_on"
    if name == "jump" and now.state in ("idle", "armed"):
        return "play"
    return ACTIONS[name].asks


def word_of(name: str, now: Standing) -> str:
    """The word on an action's button just now."""
    asks = message_of(name, now)
    if (name, asks) in OTHER_WORDS:
        return OTHER_WORDS[name, asks]
    return ACTIONS[name].word


def words_of(name: str) -> tuple[str, ...]:
    """All words that an action's button may bear: it is as wide as the widest, so that no other moves under the hand."""
    return (ACTIONS[name].word, *(word for (of, _), word in OTHER_WORDS.items() if of == name))


def _why_not_own(name: str, now: Standing) -> str:
    if name == "arm":
        if now.stage == "running":
            return "" if now.state in DISARMED else "it is armed already"
        if now.marks is None:
            return ASKED_NOW
        return "" if now.marks else NOT_SO
    if name == "preflight":
        return "" if now.stage == "before" else "it comes before the run; arming again goes through it anew"
    if name in ("record", "let_go", "hold") and not now.live:
        return NO_HANDS
    if name == "record" and not now.takes:
        return NO_TAKES
    if name == "hold" and not now.holds:
        return "this rig runs without being held"
    if name in ("jump", "next_cue") and not now.scored:
        return NO_SCORE
    if now.stage == "before" and name != "rest":
        return "arm first"
    if name in ("play", "turn", "jump") and now.state in DISARMED:
        return "arm first"
    if name == "rest" and now.stage == "before":
        return "nothing has moved"
    return ""


def _by_table(name: str, now: Standing) -> str:
    asks = message_of(name, now)
    if asks == "rest" and now.state in (*DISARMED, "resting"):
        return f"the player is {now.state}"
    if asks == "hold":
        return ""
    why = why_not(ASKED[asks], now.commands, now.state)
    return why.replace(f"'{asks}'", f"'{word_of(name, now)}'", 1)


def _why_not_again(now: Standing) -> str:
    if not now.again:
        return "this run was begun elsewhere"
    return "" if now.stage in ("over", "none") else "the run is on"


def sheet() -> list[tuple[str, str, str]]:
    """The sheet of keys: keys, word, what it does."""
    return [(" or ".join(row.keys), row.word, row.says) for row in ACTIONS.values() if row.keys]


def fields_of(asks: str, from_s: float = 0.0) -> dict[str, Any]:
    """The fields that a message wants besides its name."""
    return {"play": {"from_s": from_s}, "jump": {"to_s": from_s}, "command": {"answers": True}}.get(asks, {})
