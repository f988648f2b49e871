"""Rows that are alike, found once, so that a score that says the same thing a thousand times is worked out once."""

import numpy as np
from numpy.typing import NDArray

Index = NDArray[np.int64]


def alike(*columns: NDArray) -> tuple[Index, Index]:
    """The first row of each kind, and the kind of every row: (U,) indices of rows, (K,) indices into them.

    columns: (K,) or (K, n) arrays of 8 bytes an item that are compared bit by bit (0.0 and -0.0 as one). Rows are told
    apart by a hash and then compared; a row that only shares a hash becomes a kind of its own, so the answer is exact.
    """
    rows = np.column_stack([np.asarray(c) + np.zeros((), c.dtype) for c in columns]).astype(np.float64, copy=False)
    bits = np.ascontiguousarray(rows).view(np.uint64)
    mixed = np.full(len(bits), 0x9E3779B97F4A7C15, dtype=np.uint64)
    for column in bits.T:
        mixed ^= column + np.uint64(0x9E3779B97F4A7C15) + (mixed << np.uint64(6)) + (mixed >> np.uint64(2))
        mixed *= np.uint64(0xBF58476D1CE4E5B9)
        mixed ^= mixed >> np.uint64(29)
    _, first, kind = np.unique(mixed, return_index=True, return_inverse=True)
    apart = np.flatnonzero(np.any(bits != bits[first[kind]], axis=1))
    if len(apart):
        kind[apart] = len(first) + np.arange(len(apart))
        first = np.concatenate([first, apart])
    return first.astype(np.int64), kind.astype(np.int64)
