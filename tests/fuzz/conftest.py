"""What the fuzz tests share: how many inputs, from which seed, and the table of all targets."""

import os

import pytest

from . import files, streams, texts

TARGETS = {target.name: target for target in (*texts.TARGETS, *files.TARGETS, *streams.TARGETS)}


@pytest.fixture(params=TARGETS)
def target(request):
    """Each reader of what may be hostile."""
    return TARGETS[request.param]


@pytest.fixture(scope="session")
def long_inputs() -> int:
    """Inputs of the long form: FUZZ_INPUTS, or a million."""
    return int(os.environ.get("FUZZ_INPUTS", "1000000"))


@pytest.fixture(scope="session")
def seed() -> int:
    """Of all inputs: FUZZ_SEED, or 1."""
    return int(os.environ.get("FUZZ_SEED", "1"))
