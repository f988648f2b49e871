"""Objects through a pipe."""

import io
import os

import numpy as np
import pytest

from composer.editor import framing


def through(*things):
    """What comes out of a pipe's end, in small pieces, of what is put into it."""
    whole = b"".join(bytes(piece) for thing in things for piece in framing.packed(thing))
    return whole, io.BufferedReader(io.BytesIO(whole))


def test_arrays_come_out_as_they_went_in():
    things = ({"a": np.arange(12.0).reshape(3, 4)}, np.zeros((0, 3), np.int8), "word", np.arange(10)[::2])
    _, pipe = through(*things)
    found = [framing.read(pipe) for _ in things]
    assert np.array_equal(found[0]["a"], things[0]["a"])
    assert found[1].shape == (0, 3)
    assert found[2] == "word"
    assert found[3].tolist() == [0, 2, 4, 6, 8]


def test_arrays_are_not_within_the_pickle():
    big = np.zeros(100_000)
    pieces = list(framing.packed(big))
    assert sum(memoryview(piece).nbytes for piece in pieces[:2]) < 1000


def test_an_object_cut_short_is_the_end():
    whole, _ = through({"a": np.arange(100)})
    for cut in (0, 3, 8, 20, len(whole) - 1):
        with pytest.raises(EOFError):
            framing.read(io.BytesIO(whole[:cut]))


def test_a_pipe_of_nonsense_is_the_end_and_takes_no_memory():
    with pytest.raises(EOFError):
        framing.read(io.BytesIO(b"\xff" * 4096))


def test_each_hands_on_all_that_comes_until_the_other_end_has_gone():
    into, out = os.pipe()
    with os.fdopen(out, "wb", buffering=0) as writer:
        for number in range(3):
            framing.write(writer, number)
    heard = []
    with os.fdopen(into, "rb", buffering=0) as reader:
        framing.each(reader, heard.append)
    assert heard == [0, 1, 2]
