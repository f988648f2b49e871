"""Whatever comes in, nothing but a fault in words comes of it.

The long form: `-m soak tests/fuzz`, with FUZZ_INPUTS (a million), FUZZ_SEED, and FUZZ_KEEP, a folder for what breaks something.
"""

import os
from pathlib import Path
from random import Random

import pytest

from .running import fuzz, resident_KiB

GROWS_KIB = 64 << 10
"""Memory that may be kept after the first part of a long form: caches of grammar and numbers, not inputs."""


def test_hostile_inputs_are_refused_in_words_and_break_nothing(target, tmp_path, seed):
    found = fuzz(target, tmp_path, target.short, seed)
    assert not found.broken, found.told(tmp_path)
    assert found.inputs == target.short
    # Mutations that nobody refuses, or everybody, test nothing; what never refuses has no faults to count.
    if target.refusals:
        assert 0 < found.refused < found.inputs


@pytest.mark.soak
@pytest.mark.timeout(0)
def test_a_million_hostile_inputs_break_nothing_take_no_second_and_leave_no_memory_behind(target, tmp_path, long_inputs, seed):
    kept = Path(os.environ.get("FUZZ_KEEP", tmp_path))
    part = max(long_inputs // 20, 1)
    sizes = []
    done = 0
    while done < long_inputs:
        found = fuzz(target, tmp_path, min(part, long_inputs - done), seed + 1000 + done, alarm=True)
        done += found.inputs
        assert not found.broken, f"after {done} inputs:\n{found.told(kept)}"
        sizes.append(resident_KiB())
    print(f"{target.name}: {done} inputs, {sizes[0]} KiB after the first {part}, {sizes[-1]} at the end")
    assert sizes[-1] - sizes[min(2, len(sizes) - 1)] < GROWS_KIB, sizes


def test_the_same_seed_makes_the_same_inputs(target, tmp_path):
    examples, _ = target.make(tmp_path)
    one, two = (Random(f"{target.name} 5") for _ in range(2))
    assert [target.mutate(one, examples) for _ in range(20)] == [target.mutate(two, examples) for _ in range(20)]
