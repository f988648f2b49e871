"""From the text of a bench file to what was measured: commas, semicolons or tabs, a header, comments with #."""

import math
import re
import tomllib
from collections.abc import Mapping, Sequence

import numpy as np

from composer.faults import Fault, Faults, Where, fault, nearest
from composer.fit.bench import Bench, Said
from composer.fit.checks import check
from composer.fit.known import HEAD_KEYS

MOST_BYTES = 32 << 20
MOST_ROWS = 500_000
LEAST_ROWS = 50
MOST_FAULTS = 20
LONGEST_LINE = 4096

COLUMNS = ("time_s", "pressure_kPa", "strain")
OPTIONAL = ("force_N",)
NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")
SAYING = re.compile(r"#\s*([A-Za-z][A-Za-z0-9_]*)\s*=\s*(\S.*?)\s*")


def read_bench(text: str, file: str) -> Bench:
    """The bench that a text describes. Raises `Faults`, each at its line and column."""
    lines = text.splitlines()
    said, header = _head(lines, file)
    if header is None:
        raise fault(file, "there is no header and no data", f"a line {','.join(COLUMNS)} and then a row a line")
    mark = next((mark for mark in ",;\t" if mark in lines[header]), ",")
    places, ignored = _columns(lines[header], header + 1, mark, file)
    bench = _rows(lines, header + 1, mark, places, file, said, ignored)
    check(bench, lines, {name: place for place, name in enumerate(places)}, mark)
    return bench


def _head(lines: Sequence[str], file: str) -> tuple[dict[str, Said], int | None]:
    """What the comments before the header say of the fiber, and where the header is."""
    said: dict[str, Said] = {}
    wrong: list[Fault] = []
    for at, line in enumerate(lines):
        bare = line.strip()
        if not bare:
            continue
        if not bare.startswith("#"):
            if wrong:
                raise Faults(wrong)
            return said, at
        found = SAYING.fullmatch(bare[:LONGEST_LINE])
        if not found or len(wrong) >= MOST_FAULTS:
            continue
        name, value = found[1], found[2]
        where = Where(file, at + 1, line.index(name) + 1, len(name), line)
        if name not in HEAD_KEYS:
            hint = nearest(name, HEAD_KEYS)
            if hint:
                wrong.append(Fault(where, f"'{name}' is no key of a fiber type", "", hint + " Or take out the '='."))
        elif name in said:
            wrong.append(Fault(where, f"{name} is there twice", "", f"the other stands at line {said[name].where.line}"))
        else:
            try:
                # A bench's numbers are not as strict as TOML's: .5 and +1 will do.
                said[name] = (
                    Said(float(value), where) if NUMBER.fullmatch(value) else Said(tomllib.loads(f"v = {value}")["v"], where)
                )
            except (tomllib.TOMLDecodeError, RecursionError, ValueError):
                hint = "numbers stand without a unit, words in quotes"
                wrong.append(Fault(where, f"{name} is {value[:60]}", "a number or a word in quotes", hint))
    if wrong:
        raise Faults(wrong)
    return said, None


def _columns(line: str, number: int, mark: str, file: str) -> tuple[list[str], tuple[str, ...]]:
    """The names of the columns in their order, and those that mean nothing here."""
    names = [name.strip().strip('"').strip() for name in line.split(mark)]
    known = (*COLUMNS, *OPTIONAL)
    where = Where(file, number, 0, 1, line)
    if all(NUMBER.fullmatch(name) for name in names):
        raise Faults([Fault(where, "the first line that is no comment is data", f"a header: {','.join(COLUMNS)}")])
    wrong = []
    column = 1
    for place, (name, cell) in enumerate(zip(names, line.split(mark), strict=True)):
        if name in known and name in names[:place]:
            wrong.append(Fault(Where(file, number, column, max(len(cell), 1), line), f"the column {name} is there twice"))
        column += len(cell) + 1
    missing = [name for name in COLUMNS if name not in names]
    others = [name for name in names if name not in known]
    for name in missing:
        near = next((other for other in others if _alike(other, name)), "")
        hint = f"is '{near}' meant? It must be called {name} and be in that unit." if near else ""
        wrong.append(Fault(where, f"no column {name}", f"a header with {', '.join(COLUMNS)}", hint))
    if wrong:
        raise Faults(wrong)
    return names, tuple(others)


def _alike(other: str, name: str) -> bool:
    """Whether a column's name may stand for a known one: misspelt, or of another unit."""
    stem = name.split("_")[0]
    return bool(nearest(other, [name])) or re.split(r"[^a-z]", other.lower())[0] in (stem, stem[0])


def _rows(
    lines: Sequence[str],
    first: int,
    mark: str,
    names: Sequence[str],
    file: str,
    said: Mapping[str, Said],
    ignored: tuple[str, ...],
) -> Bench:
    wanted = [name for name in (*COLUMNS, *OPTIONAL) if name in names]
    places = [names.index(name) for name in wanted]
    values: list[list[float]] = []
    numbers: list[int] = []
    wrong: list[Fault] = []
    for at in range(first, len(lines)):
        line = lines[at]
        bare = line.strip()
        if not bare or bare[0] == "#":
            continue
        if len(numbers) >= MOST_ROWS:
            raise fault(file, f"there are more than {MOST_ROWS} rows", f"at most {MOST_ROWS}", "take every second row, or less")
        cells = line.split(mark)
        try:
            row = [float(cells[place]) for place in places]
            # float() takes more than a bench writes: nan, inf, and 1_000 for 1000.
            good = len(cells) == len(names) and "_" not in line and all(map(math.isfinite, row))
        except (ValueError, IndexError):
            good = False
        if good:
            values.append(row)
            numbers.append(at + 1)
            continue
        wrong.append(_bad_row(line, at + 1, mark, names, places, file))
        if len(wrong) >= MOST_FAULTS:
            break
    if wrong:
        raise Faults(wrong)
    if len(values) < LEAST_ROWS:
        raise fault(file, f"there are {len(values)} rows of data", f"at least {LEAST_ROWS}")
    table = np.array(values).T
    of = dict(zip(wanted, table, strict=True))
    return Bench(
        file=file,
        time=of["time_s"],
        pressure=of["pressure_kPa"] * 1e3,
        strain=of["strain"],
        force=of.get("force_N"),
        said=said,
        ignored=ignored,
        line=np.array(numbers),
    )


def _bad_row(line: str, number: int, mark: str, names: Sequence[str], places: Sequence[int], file: str) -> Fault:
    """What is wrong with a row that could not be read."""
    cells = line.split(mark)
    if len(cells) != len(names):
        hint = "a decimal comma? Numbers have a decimal point." if mark == "," and len(cells) > len(names) else ""
        return Fault(Where(file, number, 0, 1, line), f"{len(cells)} cells", f"{len(names)}, as in the header", hint)
    column = 1
    for place, cell in enumerate(cells):
        bare = cell.strip()
        if place in places:
            start = column + len(cell) - len(cell.lstrip())
            where = Where(file, number, start, max(len(bare), 1), line)
            if not bare:
                return Fault(where, f"{names[place]} is missing", "a number in every row", "take the row out, or fill it in")
            if not NUMBER.fullmatch(bare) or not math.isfinite(float(bare)):
                hint = "numbers have a decimal point" if "," in bare else ""
                return Fault(where, f"{names[place]} is '{bare[:40]}'", "a number", hint)
        column += len(cell) + 1
    return Fault(Where(file, number, 0, 1, line), "this row holds '_'", "numbers alone")
