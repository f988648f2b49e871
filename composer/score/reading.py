"""Reading a score: its text and the files that it uses become one model, or all that is wrong with them at once."""

from collections.abc import Callable
from posixpath import dirname, join, normpath

from composer.faults import Fault, Faults, Where
from composer.score.bounds import BOUNDS, most
from composer.score.checks import check_score
from composer.score.model import Group, Phrase, Score
from composer.score.row import where
from composer.score.sheet import Sheet, read_sheet
from composer.score.statements import Text

ReadUsed = Callable[[str], str]


def read_score(text: str, file: str, read_used: ReadUsed | None = None) -> Score:
    """Read a score.

    Args:
        text: the score's text
        file: its name, as messages and spans give it
        read_used: gives the text of a used file, by its path relative to the score; may raise `Faults`

    Raises:
        Faults: all that is wrong with the text and the files it uses, in the order of the lines, but for what only the
            rig can tell (`composer.score.names.check_names`).
    """
    score, faults = parse_score(text, file, read_used)
    if faults:
        raise Faults(faults)
    return score


def parse_score(text: str, file: str, read_used: ReadUsed | None = None) -> tuple[Score, list[Fault]]:
    """As `read_score`, but with the faults beside what could be read: for an editor, where a line is often half-typed."""
    table = next((line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#")), "").strip()
    if table.startswith("[") and table.endswith("]"):
        # Told once: as a score, every line of a rig file would be a fault.
        found = f"its first line is '{table[:40]}', so it is a rig or another file of settings"
        return _Reader(file, read_used).score(_Reader(file, read_used).read("", "", ())), [Fault(Where(file), found, "a score")]
    reader = _Reader(file, read_used)
    main = reader.read(text, "", ())
    score = reader.score(main)
    faults = [*reader.faults, *check_score(score, reader.doubtful, reader.torn, main.loose)]
    order = {name: at for at, name in enumerate(reader.sheets)}
    faults.sort(key=lambda fault: (order.get(fault.where.file, 0), fault.where.line, fault.where.column))
    if len(faults) > most("faults"):
        bound = BOUNDS["faults"]
        faults[bound.most - 1 :] = [Fault(Where(file), f"more than {bound.most} {bound.says}: the rest is not shown")]
    return score, faults


class _Reader:
    """The files of one score, each read once; paths are relative to the score's own folder."""

    def __init__(self, file: str, read_used: ReadUsed | None):
        self.file = file
        self.read_used = read_used
        self.sheets: dict[str, Sheet] = {}
        self.faults: list[Fault] = []
        self.doubtful: set[str] = set()
        self.torn: set[str] = set()
        self.phrases: dict[str, Phrase] = {}
        self.groups: dict[str, Group] = {}
        self.missing = False

    def shown(self, path: str) -> str:
        """A used file's name as messages give it; the score's own for an empty path."""
        return normpath(join(dirname(self.file), path)) if path else self.file

    def read(self, text: str, path: str, chain: tuple[str, ...]) -> Sheet:
        """Read one file and those that it uses; `chain` are the files that led here."""
        name = self.shown(path)
        sheet = self.sheets[name] = read_sheet(text, name)
        self.faults += sheet.faults
        self.doubtful |= sheet.doubtful
        self.torn |= sheet.torn
        for made, known in ((sheet.phrases, self.phrases), (sheet.groups, self.groups)):
            for one in made:
                self._define(one, known)
        for text_ in sheet.texts:
            if text_.kind == "use":
                self._use(text_, sheet, path, (*chain, name))
        return sheet

    def _define(self, one: Phrase | Group, known: dict) -> None:
        first = known.setdefault(one.name, one)
        if first is one:
            return
        kind = "phrase" if isinstance(one, Phrase) else "group"
        there = f"line {first.span.line}" + ("" if first.span.file == one.span.file else f" of {first.span.file}")
        span = dict(one.spans)["name"]
        self._fault(span, f"{kind} '{one.name}' is defined twice: here and in {there}", "", "give one of them another name")

    def _use(self, use: Text, sheet: Sheet, path: str, chain: tuple[str, ...]) -> None:
        span = use.name.span
        target = normpath(join(dirname(path), use.name.text))
        name = self.shown(target)
        known = [normpath(link) for link in chain]
        if name in known:
            loop = [*chain[known.index(name) :], name]
            self._fault(span, f"these files use one another in a circle: {' -> '.join(loop)}", "", "take one 'use' away")
        elif name in self.sheets:
            return
        elif len(chain) > most("depth"):
            self._fault(span, f"'use' leads more than {most('depth')} {BOUNDS['depth'].says}: {' -> '.join([*chain, name])}")
        elif len(self.sheets) > most("files"):
            self._fault(span, f"more than {most('files')} {BOUNDS['files'].says}")
        elif self.read_used is None:
            self._fault(span, "files cannot be used from here")
        else:
            try:
                text = self.read_used(target)
            except Faults as stop:
                self.missing = True
                for fault in stop.faults:
                    self._fault(span, f"cannot use '{use.name.text}': {fault.found}", fault.expected, fault.hint)
                return
            self.read(text, target, chain)

    def _fault(self, span, found: str, expected: str = "", hint: str = "") -> None:
        text = self.sheets[span.file].lines[span.line - 1]
        self.faults.append(Fault(where(span, text), found, expected, hint))

    def score(self, main: Sheet) -> Score:
        """The model: phrases and groups of all files, all else of the score's own."""
        once: dict[str, Text] = {}
        for text in main.texts:
            if text.kind == "use":
                continue
            first = once.setdefault(text.kind, text)
            if first is not text:
                self._fault(text.span, f"'{text.kind}' is written twice: here and in line {first.span.line}", "", "keep one")
        if self.missing:
            self.doubtful.add("*")
        return Score(
            file=self.file,
            title=once["title"].name.text if "title" in once else "",
            rig=once["rig"].name if "rig" in once else None,
            meters=tuple(main.meters),
            tempi=tuple(main.tempi),
            groups=self.groups,
            keep=once["keep"].name.text if "keep" in once else "clock",
            pins=tuple(main.pins),
            cues=tuple(main.cues),
            phrases=self.phrases,
            sections=tuple(main.sections),
            lines={name: sheet.lines for name, sheet in self.sheets.items()},
            spans=tuple((kind, text.name.span) for kind, text in once.items()),
        )
