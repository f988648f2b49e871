"""Every public thing says what it is; what takes or gives arrays says of what shape or in what unit."""

import ast
import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
ROOMS = ("fiber", "limits", "retime", "simulate", "drive", "score", "fit")
COMPUTING = [
    *(path for room in ROOMS for path in sorted((ROOT / "composer" / room).glob("*.py"))),
    *(ROOT / "composer" / f"{name}.py" for name in ("motion", "tracks", "quivers", "warp", "shapes")),
    *sorted((ROOT / "player" / "governor").glob("*.py")),
]

SHAPE = re.compile(r"\([A-Z0-9][\w+*]*(?:, ?[\w+*]+)*,?\)|\bshapes?\b|\b(?:broadcast|element)", re.IGNORECASE)
UNIT = re.compile(
    r"\b(?:Pa|kPa|mm|m|m³|N|J|W|s|ms|µs|kg|kg/s|L|mL|mol|K|Hz|per s|1/s|rad|deg|radians|seconds?|counts?|bars?|instants?"
    r"|strains?|shares?|stroke|rates?|pressures?|forces?|volumes?|energy|flows?|times?|durations?|indices|index|knots?|segments?"
    r"|cost|weights?|polynomials?|curves?|coefficients?|levels?|roots?|litres?|ratios?|rows?|starts?|residuals?)\b",
    re.IGNORECASE,
)
"""A unit, or a quantity whose unit is the same in every room: SI, strain as a share of rest length."""

NAMED = re.compile(r"\w_(?:s|us|ms|Pa|kPa|L|mL|L_s|m|mm|N|Hz|deg)\b")
"""A unit in a name."""


def public(path: Path):
    """Public classes, functions and methods of a module, with the name that they go by."""
    for node in ast.parse(path.read_text(encoding="utf-8")).body:
        if isinstance(node, ast.FunctionDef | ast.ClassDef) and not node.name.startswith("_"):
            yield node.name, node
            for inner in node.body if isinstance(node, ast.ClassDef) else ():
                if isinstance(inner, ast.FunctionDef) and not inner.name.startswith("_"):
                    yield f"{node.name}.{inner.name}", inner


def modules():
    """All modules of both packages."""
    return sorted(path for room in ("composer", "player") for path in (ROOT / room).rglob("*.py"))


@pytest.mark.parametrize("path", modules(), ids=lambda path: str(path.relative_to(ROOT)))
def test_every_module_and_all_that_is_public_in_it_says_what_it_is(path):
    assert ast.get_docstring(ast.parse(path.read_text(encoding="utf-8"))), "the module says nothing"
    assert [name for name, node in public(path) if not ast.get_docstring(node)] == []


@pytest.mark.parametrize("path", COMPUTING, ids=lambda path: str(path.relative_to(ROOT)))
def test_what_computes_with_arrays_says_their_shape_or_their_unit(path):
    silent = []
    for name, node in public(path):
        told = ast.get_docstring(node) or ""
        if isinstance(node, ast.ClassDef) or "." in name:
            continue
        written = ast.unparse(node.args) + (ast.unparse(node.returns) if node.returns else "")
        if re.search(r"\b(?:ND)?Array\b", written) and not (SHAPE.search(told) or UNIT.search(told) or NAMED.search(written)):
            silent.append(name)
    assert silent == []
