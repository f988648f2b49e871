"""Mutation runs: what is changed, and that a mutant is really what the tests meet."""

import os
import subprocess
import sys
from pathlib import Path

from . import mutants

SOURCE = '''
"""Two sums."""
def more(a: int = 1) -> int:
    return a + 2 if a > 3 else -a
'''


def test_each_mutant_has_one_change_and_annotations_none():
    whats = [what for _, what, _ in mutants.mutants(SOURCE)]
    assert sorted(whats) == sorted(
        [
            *("a + 2  ->  a - 2", "2  ->  3", "a > 3  ->  a >= 3", "3  ->  4", "-a  ->  +a", "1  ->  2"),
            "a + 2 if a > 3 else -a  ->  a + 2 if not a > 3 else -a",
        ]
    )
    texts = [text for _, _, text in mutants.mutants(SOURCE)]
    assert len(set(texts)) == len(texts)


def test_a_module_is_given_its_own_tests_and_else_those_that_import_it(monkeypatch):
    monkeypatch.chdir(Path(__file__).parents[1])
    assert mutants.tests_of(Path("composer/limits/rate.py")) == ["tests/composer/limits/test_rate.py"]
    assert "tests/composer/limits/test_quivering.py" in mutants.tests_of(Path("composer/limits/abilities.py"))


def test_a_mutant_that_a_test_sees_is_killed_and_one_that_none_sees_lives(tmp_path):
    (tmp_path / "room").mkdir()
    (tmp_path / "tests" / "room").mkdir(parents=True)
    (tmp_path / "room" / "sums.py").write_text("def more(a):\n    return a + 2\n\n\ndef unseen(a):\n    return not a\n")
    (tmp_path / "tests" / "room" / "test_sums.py").write_text(
        "from room.sums import more\n\n\ndef test_more():\n    assert more(1) == 3\n"
    )
    script = [sys.executable, Path(mutants.__file__), "room", "--count", "9"]
    bare = {**os.environ, "PYTEST_DISABLE_PLUGIN_AUTOLOAD": "1"}
    done = subprocess.run(script, cwd=tmp_path, capture_output=True, text=True, timeout=110, env=bare)
    told = done.stdout.splitlines()
    assert told == ["room/sums.py:6: not a  ->  not not a", "3 mutants, 1 live"], done.stderr
