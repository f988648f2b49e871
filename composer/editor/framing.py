"""Objects through a pipe: their arrays beside them, as they lie in memory, so that a large one is never copied to be read."""

import pickle
import struct
from collections.abc import Callable, Iterator
from typing import Any, BinaryIO

MOST_BYTES = 8 << 30
_COUNT = struct.Struct("<Q")


def packed(thing: Any) -> Iterator[bytes | memoryview]:
    """What is written for one object, piece by piece."""
    beside: list[pickle.PickleBuffer] = []
    head = pickle.dumps(thing, protocol=5, buffer_callback=beside.append)
    raw = [one.raw() for one in beside]
    yield b"".join(_COUNT.pack(count) for count in (len(raw), len(head), *(part.nbytes for part in raw)))
    yield head
    yield from raw


def read(file: BinaryIO) -> Any:
    """The next object. Raises EOFError where the other end has gone, also in the middle of one."""
    count = _COUNT.unpack(_exactly(file, 8))[0]
    if count > 1 << 20:
        raise EOFError
    sizes = struct.unpack(f"<{count + 1}Q", _exactly(file, 8 * (count + 1)))
    if sum(sizes) > MOST_BYTES:
        raise EOFError
    head, *beside = (_exactly(file, size) for size in sizes)
    return pickle.loads(head, buffers=beside)


def write(file: BinaryIO, thing: Any) -> None:
    """Write one object. Raises OSError or ValueError where the other end has gone."""
    for piece in packed(thing):
        view = memoryview(piece).cast("B")
        while view.nbytes:
            view = view[file.write(view) :]


def each(file: BinaryIO, does: Callable[[Any], None]) -> None:
    """Hand on every object until the other end has gone."""
    while True:
        try:
            thing = read(file)
        except (EOFError, OSError, ValueError):
            return
        does(thing)


def _exactly(file: BinaryIO, size: int) -> bytearray:
    made = bytearray(size)
    view = memoryview(made)
    while view.nbytes:
        got = file.readinto(view)
        if not got:
            raise EOFError
        view = view[got:]
    return made
