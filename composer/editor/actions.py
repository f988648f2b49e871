"""Everything that the window does, in one table: menus, keys and the sheet of keys are made from its rows."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Action:
    """Something that can be done: the method that does it, its word in a menu, its keys, a sentence; `-` above for a line.

    menu: the menu that it stands in; check: it is a state that is on or off
    """

    name: str
    menu: str
    word: str
    keys: str
    says: str
    check: bool = False
    parted: bool = False


ACTIONS: tuple[Action, ...] = (
    Action("new", "&Score", "&New", "Ctrl+N", "begin a score with next to nothing in it"),
    Action("open", "&Score", "&Open …", "Ctrl+O", "open a score"),
    Action("save", "&Score", "&Save", "Ctrl+S", "save; the old file stays whole until the new one is"),
    Action("save_as", "&Score", "Save &as …", "Ctrl+Shift+S", "save under another name"),
    Action("print", "&Score", "&Print to PDF …", "Ctrl+P", "cloth and snags as pages for the rehearsal-room wall", parted=True),
    Action("quit", "&Score", "&Close", "Ctrl+Q", "close the window", parted=True),
    Action("undo", "&Edit", "&Undo", "Ctrl+Z", "take back what was done last: typing, drags and mends are one history"),
    Action("redo", "&Edit", "&Redo", "Ctrl+Shift+Z", "do again what was taken back"),
    Action("cut", "&Edit", "Cu&t", "Ctrl+X", "cut what is chosen in the text", parted=True),
    Action("copy", "&Edit", "&Copy", "Ctrl+C", "copy what is chosen in the text"),
    Action("paste", "&Edit", "&Paste", "Ctrl+V", "paste text"),
    Action("choose_all", "&Edit", "Choose &all", "Ctrl+A", "choose the whole text"),
    Action("complete", "&Edit", "Co&mplete the word", "Ctrl+Space", "what may stand at the caret", parted=True),
    Action("explain", "&Edit", "&Explain the word", "Ctrl+E", "what the word at the caret means here"),
    Action("comment", "&Edit", "Comment or not", "Ctrl+/", "make the chosen lines comments, or take that back"),
    Action(
        "copy_phrase",
        "&Edit",
        "Copy the phrase for this one",
        "Ctrl+D",
        "the entry at the caret, or of the chosen hit, gets a copy of its phrase of its own",
    ),
    Action("find", "&Edit", "&Find …", "Ctrl+F", "find words in the text, and put others in their place", parted=True),
    Action("find_next", "&Edit", "Find the next", "F3", "the next place where they stand"),
    Action("find_previous", "&Edit", "Find the one before", "Shift+F3", "the place before where they stand"),
    Action("go", "&Edit", "&Go to …", "Ctrl+G", "a line, a place such as 9:1, a cue, a section or a phrase"),
    Action("next_snag", "S&nags", "&Next snag", "F8", "the next snag, and what would mend it"),
    Action("previous_snag", "S&nags", "&Snag before", "Shift+F8", "the snag before"),
    Action("mend", "S&nags", "&Mend it", "Ctrl+M", "go to the choices that would mend the chosen snag"),
    Action(
        "take_hit", "S&nags", "Take the retiming of the chosen &hit", "Ctrl+Alt+H", "into the text, as one step", parted=True
    ),
    Action("take_passage", "S&nags", "Take the retiming of the &passage", "Ctrl+Alt+P", "of the passage that is looped"),
    Action("take_all", "S&nags", "Take &all of the retiming", "Ctrl+Alt+A", "into the text, as one step"),
    Action("beside", "&View", "Retiming &beside the written", "Ctrl+R", "show on the cloth where hits would move", check=True),
    Action(
        "simulated",
        "&View",
        "Show and play as &retimed",
        "Ctrl+Shift+R",
        "simulate, and move the hanging fibers, as retimed and not as written",
        check=True,
    ),
    Action("show_cloth", "&View", "&Cloth", "Alt+1", "time to the right, a thread a fiber", parted=True),
    Action("show_hang", "&View", "&Hanging fibers", "Alt+2", "the fibers where they hang, moved as simulated"),
    Action("show_rig", "&View", "R&ig", "Alt+3", "what each fiber can do"),
    Action("next_part", "&View", "Next part of the window", "F6", "text, cloth, strand, snags, and round again", parted=True),
    Action("previous_part", "&View", "Part before", "Shift+F6", "the other way round"),
    Action("text_part", "&View", "To the text", "Alt+0", "put the keys into the text"),
    Action("larger", "&View", "Larger letters", "Ctrl++", "everywhere; Ctrl and the wheel: in the text alone", parted=True),
    Action("smaller", "&View", "Smaller letters", "Ctrl+-", "everywhere"),
    Action("theme", "&View", "&Light or dark", "Ctrl+Shift+L", "the other look"),
    Action("play", "&Play", "&Play or pause", "Ctrl+Return", "from the play head"),
    Action("to_start", "&Play", "To the &start", "Ctrl+Shift+Home", "put the play head at the beginning"),
    Action("head_here", "&Play", "Head to the &caret", "Ctrl+J", "where the caret's line first moves something"),
    Action("loop_from", "&Play", "Passage &from here", "Ctrl+I", "what is looped begins at the play head", parted=True),
    Action("loop_to", "&Play", "Passage &to here", "Ctrl+Shift+I", "it ends at the play head"),
    Action("no_loop", "&Play", "&No passage", "Ctrl+Shift+N", "play on to the end"),
    Action("slower", "&Play", "S&lower", "Ctrl+,", "a step slower", parted=True),
    Action("faster", "&Play", "Fast&er", "Ctrl+.", "a step faster"),
    Action("half_speed", "&Play", "&Half speed or whole", "Ctrl+H", "half as fast, or as fast as written"),
    Action(
        "clicks",
        "&Play",
        "Counts to be hear&d",
        "Ctrl+Shift+K",
        "a click on each count, where the machine has sound",
    ),
    Action(
        "finer_grid",
        "&Play",
        "Finer grid",
        "Ctrl+]",
        "what is dragged snaps to finer counts; Alt while dragging: to none",
        parted=True,
    ),
    Action("coarser_grid", "&Play", "Coarser grid", "Ctrl+[", "what is dragged snaps to coarser counts"),
    Action("keys", "&Help", "&Keys", "F1", "this sheet"),
    Action("first_help", "&Help", "&What to try first", "", "three lines for a first hour"),
    Action("about", "&Help", "&About", "", "which version this is"),
)


def by_menu() -> dict[str, list[Action]]:
    """The actions of each menu, in order."""
    menus: dict[str, list[Action]] = {}
    for action in ACTIONS:
        menus.setdefault(action.menu, []).append(action)
    return menus


def keys_in_words(keys: str) -> str:
    """Keys as a person reads them."""
    return keys.replace("+", " + ").replace(" +  + ", " + +") if keys else ""
