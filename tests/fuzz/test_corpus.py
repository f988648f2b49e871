"""What once broke a reader is read again: every file in corpus/NAME is an input of the target of that name."""

from dataclasses import replace
from pathlib import Path
from time import process_time

import pytest

from .conftest import TARGETS
from .running import Target, attempt, in_time

CORPUS = Path(__file__).parent / "corpus"
KEPT = sorted(path for path in CORPUS.glob("*/*") if path.parent.name in TARGETS)


@pytest.mark.parametrize("path", KEPT, ids=lambda path: f"{path.parent.name}: {path.name}")
def test_what_once_broke_something_no_longer_does(path, tmp_path):
    target = TARGETS[path.parent.name]
    _, read = target.make(tmp_path)
    assert not attempt(read, target.refusals, path.read_bytes())


@pytest.mark.soak
@pytest.mark.parametrize("path", KEPT, ids=lambda path: f"{path.parent.name}: {path.name}")
def test_what_once_took_too_long_no_longer_does(path, tmp_path):
    target = TARGETS[path.parent.name]
    examples, read = target.make(tmp_path)
    attempt(read, (), examples[0])  # what is worked out once, and kept
    assert not in_time(target, read, path.read_bytes())


def test_what_takes_longer_than_it_may_is_found_however_it_ends(tmp_path):
    def spinning(seconds, ends=None):
        def read(data):
            begun = process_time()
            while process_time() - begun < seconds:
                pass
            if ends:
                raise ends
            return 10

        return read

    quick = Target("spinning", lambda folder: ([b""], spinning(0.0)), (ValueError,), 1, longest_s=0.02)
    assert in_time(quick, spinning(0.03), b"").startswith(("Slow at spinning", "Hangs"))
    assert in_time(quick, spinning(0.0), b"") == ""
    assert in_time(quick, spinning(0.0, ValueError()), b"") is None
    patient = replace(quick, each_s=0.002)
    assert in_time(patient, spinning(0.03), b"") == ""
    assert in_time(patient, spinning(0.05), b"").startswith("Slow at spinning")
    assert in_time(patient, spinning(0.05, ValueError()), b"").startswith("Slow at spinning")


def test_every_file_of_the_corpus_belongs_to_a_target():
    assert {path.parent.name for path in CORPUS.glob("*/*")} <= {*TARGETS, "device-c"}
