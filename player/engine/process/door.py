"""The run's end of the local socket: who is attached, who commands, what is asked and told. Never blocks on anybody.

Each front end has a queue that is bounded; lines that find no room in it are dropped and counted. A front end that is stopped,
slow or hostile costs the run nothing but that.
"""

import os
import select
import socket
from collections import Counter
from collections.abc import Callable
from contextlib import suppress
from typing import Any

from player.engine.process import messages
from player.engine.process.peers import Stranger, check_peer

MOST_FRONTS = MOST_SILENT = 16
"""Front ends that are attached, and such that have not said hello yet."""

QUEUE_BYTES = 1 << 18
"""What waits for a front end that does not read; what is told last of all may be longer."""

READ_BYTES = 4096
UNFIT_MOST = 20
"""A front end that has sent so much that is no message is let go."""

NOTES_MOST = 500
"""Of each kind in the log: nobody fills a disk by nonsense, or hides behind it."""

STANDS_S = 5.0
"""A front end that has said that it is here, and says nothing for so long, stands still: it no longer commands."""

HELLO_S = LAST_S = 2.0
LOOK_S = 0.02


class Front:
    """One front end that is attached, or about to be."""

    def __init__(self, connection: socket.socket):
        connection.setblocking(False)
        self.socket = connection
        self.heard = b""
        self.waits = bytearray()
        self.greeted = self.commands = self.answers = False
        self.unfit = self.missed = 0
        self.here_s: float | None = None

    def put(self, line: bytes, surely: bool = False) -> bool:
        """Queue a line; False where there is no room for it."""
        if not surely and len(self.waits) + len(line) > QUEUE_BYTES:
            return False
        self.waits += line
        return True

    def flush(self) -> None:
        """Send what can be sent now. Raises OSError where the other end is gone."""
        while self.waits:
            try:
                sent = self.socket.send(self.waits)
            except BlockingIOError:
                return
            del self.waits[:sent]


class Door:
    """All front ends of a run. `serve` is called many times a second by the engine's loop; nothing else reads the sockets.

    take: called with what may be asked, by name and fields; returns why it is not done, "" where it is
    state: the safety state just now; left: called when the front end that commands is gone; note: called with what the log
        is told, as fields
    rule: of messages.RULES; commanded: whether a front end commands; answers: whether that one has somebody with keys
    """

    def __init__(
        self, run: str, about: dict[str, Any], memory: int, rule: str, listener: socket.socket | None = None,
        now: Callable[[], float] = lambda: 0.0,
    ):  # fmt: skip
        """memory: descriptor of the shared memory, read only; listener: bound and listening, None where nobody can attach;
        now: a steady clock, in s
        """
        self.run, self.about, self.rule = run, about, rule
        self.take: Callable[[str, dict[str, Any]], str] = lambda name, fields: "not yet"
        self.state: Callable[[], str] = lambda: "idle"
        self.left: Callable[[], None] = lambda: None
        self.note: Callable[..., None] = lambda **told: None
        self._memory, self._listener, self._now = memory, listener, now
        self._fronts: list[Front] = []
        self._notes: Counter[str] = Counter()
        self._marks: dict[str, Any] | None = None
        self._poll = select.poll()
        if listener is not None:
            listener.setblocking(False)
            self._poll.register(listener, select.POLLIN)

    @property
    def commanded(self) -> bool:
        """Whether a front end commands."""
        return any(front.commands for front in self._fronts)

    @property
    def answers(self) -> bool:
        """Whether the one that commands has somebody with keys."""
        return any(front.commands and front.answers for front in self._fronts)

    @property
    def attached(self) -> int:
        """How many front ends there are."""
        return sum(front.greeted for front in self._fronts)

    def adopt(self, connection: socket.socket) -> None:
        """A connection of which is known whose it is: to the front end that has started the run."""
        self._fronts.append(Front(connection))
        self._poll.register(connection, select.POLLIN)

    def await_hello(self) -> None:
        """Wait until the front end that was adopted has said hello, so that whatever goes wrong next is told to it."""
        waits = int(HELLO_S / LOOK_S)
        while waits > 0 and self._fronts and not self.attached:
            waits -= 1
            select.select([front.socket for front in self._fronts], [], [], LOOK_S)
            self.serve()

    def serve(self) -> None:
        """Hear and do what has come in, send what waits; returns at once."""
        ready = {number for number, _ in self._poll.poll(0)}
        if self._listener is not None and self._listener.fileno() in ready:
            self._accept()
        for front in tuple(self._fronts):
            if front.socket.fileno() in ready:
                self._hear(front)
            if front.waits:
                self._flush(front)
        # After all have been heard: it may be this process that has stood still.
        for front in self._fronts:
            if front.commands and front.here_s is not None and self._now() - front.here_s > STANDS_S:
                self._stands_still(front)

    def tell(self, lines: tuple[str, ...]) -> None:
        """Lines for every operator."""
        if not lines:
            return
        for front in self._fronts:
            if front.greeted:
                told = front.put(messages.packed("told", lines=list(lines), missed=front.missed))
                front.missed = 0 if told else front.missed + len(lines)

    def say(self, name: str, **fields: Any) -> None:
        """Something of messages.TOLD to every front end that is attached."""
        line = messages.packed(name, **fields)
        if name == "marks":
            self._marks = fields
        for front in self._fronts:
            if front.greeted:
                front.put(line)

    def finish(self, name: str, **fields: Any) -> None:
        """The last message, with time to be read by whoever reads; then all is let go."""
        for front in self._fronts:
            front.put(messages.packed(name, **fields), surely=True)
        waits = int(LAST_S / LOOK_S)
        while waits > 0 and any(front.waits for front in self._fronts):
            waits -= 1
            select.select([], [front.socket for front in self._fronts if front.waits], [], LOOK_S)
            for front in tuple(self._fronts):
                self._flush(front, quietly=True)
        self.close()

    def close(self) -> None:
        """Let go of every socket; harmless when called twice."""
        for front in self._fronts:
            front.socket.close()
        self._fronts.clear()
        if self._listener is not None:
            with suppress(OSError):
                os.unlink(self._listener.getsockname())
            self._listener.close()
            self._listener = None

    def _accept(self) -> None:
        assert self._listener is not None
        try:
            connection, _ = self._listener.accept()
        except OSError:
            return
        why = ""
        try:
            check_peer(connection)
        except Stranger:
            why = "this run belongs to another user: only they may attach to it"
        silent = [front for front in self._fronts if not front.greeted]
        if len(silent) >= MOST_SILENT:
            self._let_go(silent[0], "let go: it has not said hello")
        if why:
            self._told("refused", why)
            with suppress(OSError):
                connection.setblocking(False)
                connection.send(messages.packed("refused", what="hello", why=why))
            connection.close()
            return
        self.adopt(connection)

    def _hear(self, front: Front) -> None:
        try:
            data = front.socket.recv(READ_BYTES)
        except BlockingIOError:
            return
        except OSError:
            data = b""
        if not data:
            self._let_go(front, "gone")
            return
        if front.here_s is not None:
            front.here_s = self._now()
        *lines, front.heard = (front.heard + data).split(b"\n")
        if len(front.heard) > messages.LONGEST_ASKED:
            self._let_go(front, f"let go: it sent more than {messages.LONGEST_ASKED} bytes that are no message")
            return
        for line in lines:
            try:
                name, fields = messages.read(line, messages.ASKED)
                why = self._asked(front, name, fields)
            except messages.Unfit as unfit:
                name, why = "", str(unfit)
                front.unfit += 1
            if why:
                self._told("refused", f"{name}: {why}" if name else why)
                front.put(messages.packed("refused", what=name, why=why))
            if front.unfit > UNFIT_MOST:
                self._let_go(front, "let go: it sent too much that is no message")
            if front not in self._fronts:
                return

    def _asked(self, front: Front, name: str, fields: dict[str, Any]) -> str:
        """Do what was asked; why not, "" where it is done."""
        if name == "hello":
            return self._greet(front, fields)
        if not front.greeted and name != "vent":
            return "a front end says hello first"
        row = messages.ASKED[name]
        why = messages.why_not(row, front.commands, self.state())
        if why:
            return why
        if name == "leave":
            self._let_go(front, "left")
        elif name == "here":
            front.here_s = self._now()
        elif name == "command":
            if self.commanded:
                return "" if front.commands else "another front end commands"
            front.commands, front.answers = True, fields["answers"]
            self._told("commands")
            self._say_who()
        elif name == "when_left":
            self.rule = fields["rule"]
            self._told("rule", self.rule)
            self._say_who()
        else:
            return self.take(name, fields)
        return ""

    def _greet(self, front: Front, fields: dict[str, Any]) -> str:
        if front.greeted:
            return "it has said hello already"
        if self.attached >= MOST_FRONTS:
            return f"there are {MOST_FRONTS} front ends attached already; end one of them"
        if fields["version"] != messages.VERSION:
            return "the run is of another version: use the same drawcord for both"
        front.greeted = True
        front.commands = fields["commands"] and not self.commanded
        front.answers = front.commands and fields["answers"]
        welcome = messages.packed(
            "welcome", version=messages.VERSION, run=self.run, pid=os.getpid(), commands=front.commands, about=self.about
        )
        try:
            # The descriptor goes with the first byte, so whatever was answered before must be on its way.
            front.flush()
            if front.waits:
                raise BlockingIOError
            sent = socket.send_fds(front.socket, [welcome[:1]], [self._memory])
            front.put(welcome[sent:], surely=True)
        except OSError:
            self._let_go(front, "gone")
            return ""
        self._told("attached", "commands" if front.commands else "watches")
        if self._marks is not None:
            front.put(messages.packed("marks", **self._marks))
        self._say_who()
        return ""

    def _say_who(self) -> None:
        taken = self.commanded
        for front in self._fronts:
            if front.greeted:
                front.put(messages.packed("command", commands=front.commands, taken=taken, rule=self.rule))

    def _stands_still(self, front: Front) -> None:
        """It stays attached, and may command again once it moves, where nobody else does."""
        front.commands = front.answers = False
        self._told("stands still")
        self.left()
        self._say_who()

    def _let_go(self, front: Front, how: str) -> None:
        if front not in self._fronts:
            return
        self._fronts.remove(front)
        self._poll.unregister(front.socket)
        front.socket.close()
        if front.greeted or how != "gone":
            self._told(how)
        if front.commands:
            self.left()
            self._say_who()

    def _flush(self, front: Front, quietly: bool = False) -> None:
        try:
            front.flush()
        except OSError:
            if quietly:
                front.waits.clear()
            else:
                self._let_go(front, "gone")

    def _told(self, what: str, say: str = "") -> None:
        """Into the log, bounded."""
        self._notes[what] += 1
        if self._notes[what] <= NOTES_MOST:
            self.note(what=what, say=say, attached=self.attached)
