"""Doors, and front ends at them, in one process."""

import socket
from contextlib import suppress

import pytest

from player.engine.process import layout, messages
from player.engine.process.door import Door
from player.engine.process.start import shared


class Visitor:
    """The bare other end of a socket: says bytes, hears messages."""

    def __init__(self, door):
        self.socket, theirs = socket.socketpair()
        self.socket.setblocking(False)
        self._door, self._rest = door, b""
        door.adopt(theirs)

    def say(self, name, **fields):
        return self.send(messages.packed(name, **fields))

    def send(self, data):
        self.socket.sendall(data)
        self._door.serve()
        return self.hear()

    def hello(self, commands=False, answers=False, version=messages.VERSION):
        return self.say("hello", version=version, commands=commands, answers=answers)

    def hear(self):
        """What has come, as [(name, fields)]."""
        data = self._rest
        # What comes with a descriptor ends a reception, however much there is.
        with suppress(BlockingIOError, ConnectionResetError):
            while more := self.socket.recv(1 << 20):
                data += more
        *lines, self._rest = data.split(b"\n")
        return [messages.read(line, messages.TOLD, messages.LONGEST_TOLD) for line in lines]


@pytest.fixture
def door():
    descriptor, buffer = shared(layout.size_of(4, 1))
    layout.Writer(buffer, 4, 1)
    made = Door("bench-1", {"title": "Bench piece"}, descriptor, "rest")
    made.taken, made.notes, made.lefts = [], [], 0
    made.take = lambda name, fields: made.taken.append((name, fields)) or ""
    made.note = lambda **told: made.notes.append(told)

    def left():
        made.lefts += 1

    made.left = left
    yield made
    made.close()


@pytest.fixture
def visit(door):
    made = []

    def visit():
        made.append(Visitor(door))
        return made[-1]

    yield visit
    for one in made:
        one.socket.close()
