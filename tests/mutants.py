"""Mutants: a room's code with one operator, number or condition changed, each under the tests of its module; those that live.

python tests/mutants.py composer/limits [--count 60] [--seed 1] [--tests FILE ...] [--seconds 60]

Each mutant lives in a child of this process and in memory alone: no file is changed. A module without tests of its own gets
those that import it; what survives there is to be tried once more with `--tests`, and then read.
"""

import argparse
import ast
import importlib.abc
import importlib.util
import os
import re
import resource
import sys
from collections.abc import Iterator, Sequence
from pathlib import Path
from random import Random

import pytest

COMPARED = {
    ast.Lt: ast.LtE, ast.LtE: ast.Lt, ast.Gt: ast.GtE, ast.GtE: ast.Gt, ast.Eq: ast.NotEq, ast.NotEq: ast.Eq,
    ast.Is: ast.IsNot, ast.IsNot: ast.Is, ast.In: ast.NotIn, ast.NotIn: ast.In,
}  # fmt: skip
COUNTED = {
    ast.Add: ast.Sub, ast.Sub: ast.Add, ast.Mult: ast.Div, ast.Div: ast.Mult, ast.FloorDiv: ast.Mult, ast.Mod: ast.Mult,
    ast.BitAnd: ast.BitOr, ast.BitOr: ast.BitAnd, ast.LShift: ast.RShift, ast.RShift: ast.LShift,
}  # fmt: skip
NAMED = {"minimum": "maximum", "maximum": "minimum", "min": "max", "max": "min", "any": "all", "all": "any"}


def sites(tree: ast.Module) -> list[ast.AST]:
    """The nodes of a module that can be changed: none of decorators and annotations, which say what is, not what happens."""
    told: set[int] = set()
    for node in ast.walk(tree):
        parts = list(getattr(node, "decorator_list", ()))
        parts += [part for part in (getattr(node, "annotation", None), getattr(node, "returns", None)) if part is not None]
        told |= {id(inner) for part in parts for inner in ast.walk(part)}
    return [node for node in ast.walk(tree) if id(node) not in told and _can(node)]


def _can(node: ast.AST) -> bool:
    match node:
        case ast.Compare(ops=[op]):
            return type(op) in COMPARED
        case ast.BinOp(op=op) | ast.AugAssign(op=op):
            return type(op) in COUNTED
        case ast.Constant(value=value):
            return isinstance(value, int | float)
        case ast.Attribute(attr=name) | ast.Name(id=name, ctx=ast.Load()):
            return name in NAMED
    return isinstance(node, ast.BoolOp | ast.If | ast.IfExp | ast.While) or (
        isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.Not | ast.USub)
    )


def change(node: ast.AST) -> None:
    """Change a node of `sites` in place."""
    match node:
        case ast.Compare():
            node.ops = [COMPARED[type(node.ops[0])]()]
        case ast.BinOp() | ast.AugAssign():
            node.op = COUNTED[type(node.op)]()
        case ast.Constant(value=bool(value)):
            node.value = not value
        case ast.Constant(value=value):
            node.value = value + 1 if isinstance(value, int) or value == 0.0 else 1.5 * value
        case ast.Attribute():
            node.attr = NAMED[node.attr]
        case ast.Name():
            node.id = NAMED[node.id]
        case ast.BoolOp():
            node.op = ast.And() if isinstance(node.op, ast.Or) else ast.Or()
        case ast.UnaryOp():
            node.op = ast.UAdd() if isinstance(node.op, ast.USub) else node.op
            node.operand = ast.UnaryOp(ast.Not(), node.operand) if isinstance(node.op, ast.Not) else node.operand
        case ast.If() | ast.IfExp() | ast.While():
            node.test = ast.UnaryOp(ast.Not(), node.test)


def mutants(source: str) -> Iterator[tuple[int, str, str]]:
    """Every mutant of a module: the line, what was and what is there, the module's text."""
    for number in range(len(sites(ast.parse(source)))):
        tree = ast.parse(source)
        node = sites(tree)[number]
        was = ast.unparse(node).split("\n")[0]
        change(node)
        ast.fix_missing_locations(tree)
        yield node.lineno, f"{was}  ->  {ast.unparse(node).splitlines()[0]}", ast.unparse(tree)


def tests_of(module: Path) -> list[str]:
    """The tests of a module: its own file, else those of its room that import it."""
    room = Path("tests") / module.parent
    own = [*room.glob(f"test_{module.stem}.py"), *sorted(room.glob(f"test_{module.stem}_*.py"))]
    name = re.escape(".".join(module.parent.parts))
    imports = re.compile(rf"{name}\.{module.stem}\b|from {name} import [^\n]*\b{module.stem}\b")
    return [str(path) for path in own or sorted(path for path in room.glob("test_*.py") if imports.search(path.read_text()))]


class InPlace(importlib.abc.MetaPathFinder, importlib.abc.SourceLoader):
    """Gives one module another text than its file's."""

    def __init__(self, module: Path, text: str):
        self._name, self._path, self._text = ".".join(module.with_suffix("").parts), str(module.resolve()), text

    def find_spec(self, name, path, target=None):
        return importlib.util.spec_from_file_location(name, self._path, loader=self) if name == self._name else None

    def get_filename(self, name):
        return self._path

    def get_data(self, path):
        return self._text.encode()


def lives(module: Path, text: str, tests: Sequence[str], seconds: int) -> bool:
    """Whether all tests pass with that text in the module's place, in a child that may compute for so many seconds."""
    child = os.fork()
    if child == 0:
        resource.setrlimit(resource.RLIMIT_CPU, (seconds, seconds + 1))
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, 1)
        os.dup2(nowhere, 2)
        sys.meta_path.insert(0, InPlace(module, text))
        try:
            code = int(pytest.main(["-x", "-q", "-p", "no:cacheprovider", *tests]))
        except BaseException:
            code = 1
        os._exit(code)
    return os.waitpid(child, 0)[1] == 0


def main() -> None:
    """A sample of a room, as many of each module; every survivor told, and the count."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("room", type=Path, help="a folder, or one module")
    parser.add_argument("--count", type=int, default=60)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--seconds", type=int, default=60, help="of the processor, for the tests of a mutant")
    parser.add_argument("--tests", nargs="+", help="instead of each module's own")
    asked = parser.parse_args()
    sys.path.insert(0, "")
    modules = [asked.room] if asked.room.is_file() else sorted(asked.room.glob("*.py"))
    chance, made = Random(asked.seed), []
    for module in modules:
        found, tests = list(mutants(module.read_text())), asked.tests or tests_of(module)
        if found and tests and lives(module, module.read_text(), tests, asked.seconds):
            chance.shuffle(found)
            made.append([(module, tests, *one) for one in found])
        elif found:
            print(f"{module}: left out, as it has no tests that pass within {asked.seconds} s", flush=True)
    turns = [one for turn in range(max(map(len, made), default=0)) for several in made for one in several[turn : turn + 1]]
    alive = 0
    for module, tests, line, what, text in turns[: asked.count]:
        if lives(module, text, tests, asked.seconds):
            alive += 1
            print(f"{module}:{line}: {what}", flush=True)
    print(f"{min(asked.count, len(turns))} mutants, {alive} live")


if __name__ == "__main__":
    main()
