"""What once broke a reader is read again: every file in corpus/NAME is an input of the target of that name."""

from pathlib import Path

import pytest

from .conftest import TARGETS
from .running import attempt

CORPUS = Path(__file__).parent / "corpus"
KEPT = sorted(path for path in CORPUS.glob("*/*") if path.parent.name in TARGETS)


@pytest.mark.parametrize("path", KEPT, ids=lambda path: f"{path.parent.name}: {path.name}")
def test_what_once_broke_something_no_longer_does(path, tmp_path):
    target = TARGETS[path.parent.name]
    _, read = target.make(tmp_path)
    assert not attempt(read, target.refusals, path.read_bytes())


def test_every_file_of_the_corpus_belongs_to_a_target():
    assert {path.parent.name for path in CORPUS.glob("*/*")} <= {*TARGETS, "device-c"}
