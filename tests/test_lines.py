"""The lines between the rooms, as DEVELOPERS.md draws them and pyproject.toml states them."""

import ast
import os
from pathlib import Path

import pytest
from importlinter.cli import lint_imports

ROOT = Path(__file__).parent.parent
SOURCES = sorted(path for room in ("composer", "player") for path in (ROOT / room).rglob("*.py"))
TOUCH_FILES = ("composer/files.py", "composer/load.py", "play_file.py", "/commands/", "player/outputs/", "picture/png.py")


def test_imports_keep_to_the_lines(monkeypatch, capsys):
    monkeypatch.chdir(ROOT)
    code = lint_imports(config_filename=os.fspath(ROOT / "pyproject.toml"), cache_dir=None)
    assert code == 0, capsys.readouterr().out


@pytest.mark.parametrize("path", SOURCES, ids=lambda path: path.relative_to(ROOT).as_posix())
def test_only_the_shells_open_files(path):
    """`open` needs no import, so the imports alone would not show it."""
    where = path.relative_to(ROOT).as_posix()
    if any(part in where for part in TOUCH_FILES):
        return
    calls = [node for node in ast.walk(ast.parse(path.read_text())) if isinstance(node, ast.Call)]
    opened = [node.lineno for node in calls if isinstance(node.func, ast.Name) and node.func.id == "open"]
    assert not opened, f"{where} opens a file in line {opened[0]}"


def test_every_room_of_the_map_is_there_and_every_room_is_on_the_map():
    text = (ROOT / "DEVELOPERS.md").read_text()
    for room in ("composer", "player"):
        for folder in (ROOT / room).iterdir():
            if folder.is_dir() and folder.name not in ("__pycache__", "manual"):
                assert f"`{room}/{folder.name}`" in text, f"{room}/{folder.name} is not on the map in DEVELOPERS.md"
