"""A front end's end of the socket to a run: what it says, what it hears, what it sees in shared memory."""

import mmap
import os
import select
import socket
from contextlib import suppress
from typing import Any

from player.engine.process import messages
from player.engine.process.layout import Reader, Snapshot, Unreadable
from player.engine.process.peers import Stranger, check_peer

MOST_AT_ONCE = 65536
WELCOME_S = 10.0


class NotThere(Exception):
    """No run answers there; the text says why, for the operator."""


class Client:
    """Attached to a run. Never blocks but in `hear`, and there no longer than asked.

    about: what the run is (`messages.TOLD["welcome"]`); run, pid: its name and process
    commands: whether this front end commands; gone: whether the run has closed the socket, or died
    """

    def __init__(
        self,
        connection: socket.socket,
        commands: bool,
        answers: bool = False,
        vents: bool = False,
        patience_s: float = WELCOME_S,
    ):
        """Say hello over a connected socket and wait for the welcome; vents: say vent before all else;
        patience_s: how long to wait.

        Raises NotThere, Stranger, Unreadable.
        """
        self._socket = connection
        self._rest = b""
        self._kept: list[tuple[str, dict[str, Any]]] = []
        self._descriptor = -1
        self._reader: Reader | None = None
        self._map: mmap.mmap | None = None
        self.gone = False
        self.about: dict[str, Any] = {}
        self.run, self.pid, self.commands = "", 0, False
        try:
            check_peer(connection)
            connection.setblocking(False)
            if vents:
                self.say("vent")
            self.say("hello", version=messages.VERSION, commands=commands, answers=answers)
            self._await_welcome(patience_s)
        except BaseException:
            self.close()
            raise

    @classmethod
    def at(cls, path: str, commands: bool, answers: bool = False, vents: bool = False) -> "Client":
        """Attach to the run that listens at a path. Raises NotThere, Stranger, Unreadable."""
        connection = socket.socket(socket.AF_UNIX, socket.SOCK_STREAM)
        try:
            connection.settimeout(WELCOME_S)
            connection.connect(path)
        except OSError as why:
            connection.close()
            if isinstance(why, ConnectionRefusedError):
                # Its run was killed: nobody can listen there again.
                with suppress(OSError):
                    os.unlink(path)
            if isinstance(why, PermissionError):
                # Where a user's runs listen, nobody else may look.
                raise Stranger(f"the run at {path} belongs to another user: only they may attach to it") from None
            raise NotThere(f"no run answers at {path}: {why.strerror or why}") from None
        return cls(connection, commands, answers, vents)

    def say(self, name: str, /, **fields: Any) -> bool:
        """Say something of `messages.ASKED`; whether it is on its way. A signal's handler or another thread may call it."""
        line = messages.packed(name, **fields)
        try:
            return self._socket.send(line) == len(line)
        except (BlockingIOError, OSError):
            return False

    def hear(self, timeout_s: float = 0.0) -> list[tuple[str, dict[str, Any]]]:
        """What the run has said, each as name and fields; waits for the first as long as that."""
        heard, self._kept = self._kept, []
        if not heard and not self.gone:
            heard = self._receive(timeout_s)
        for name, fields in heard:
            if name == "command":
                self.commands = fields["commands"]
        return heard

    def put_back(self, heard: list[tuple[str, dict[str, Any]]]) -> None:
        """What was heard and not used yet: it is heard again, before all else."""
        self._kept = heard + self._kept

    def is_there(self) -> bool:
        """Whether the run is there still; takes nothing of what it has said."""
        if not self.gone:
            try:
                self.gone = self._socket.recv(1, socket.MSG_PEEK) == b""
            except BlockingIOError:
                return True
            except OSError:
                self.gone = True
        return not self.gone

    def snapshot(self) -> Snapshot:
        """The run as it is now; as it was last where it is gone. Also there after `close`."""
        assert self._reader is not None
        return self._reader.snapshot()

    def fileno(self) -> int:
        """The socket's descriptor, for whoever waits for several things at once."""
        return self._socket.fileno()

    def leave(self) -> None:
        """Detach by will."""
        self.say("leave")
        self.close()

    def close(self) -> None:
        """Let go of the socket; harmless when called twice."""
        self.gone = True
        self._socket.close()
        if self._descriptor >= 0:
            os.close(self._descriptor)
            self._descriptor = -1

    def _await_welcome(self, patience_s: float) -> None:
        waits = int(patience_s / 0.1)
        while not self.gone and waits > 0:
            waits -= 1
            for name, fields in self._receive(0.1):
                if name == "welcome" and not self.about:
                    self._welcomed(fields)
                elif name == "refused" and fields["what"] == "hello" and not self.about:
                    raise NotThere(fields["why"])
                else:
                    self._kept.append((name, fields))
            if self.about:
                return
        raise NotThere("the run is gone" if self.gone else f"the run does not answer within {patience_s:g} s")

    def _welcomed(self, fields: dict[str, Any]) -> None:
        if int(fields["version"]) != messages.VERSION or self._descriptor < 0:
            raise Unreadable("the run is of another version: use the same drawcord for both")
        self.about, self.run, self.pid = fields["about"], fields["run"], int(fields["pid"])
        self.commands = fields["commands"]
        size = os.fstat(self._descriptor).st_size
        if size == 0:
            raise Unreadable("the engine's shared memory is empty")
        self._map = mmap.mmap(self._descriptor, size, mmap.MAP_SHARED, mmap.PROT_READ)
        self._reader = Reader(self._map)

    def _receive(self, timeout_s: float) -> list[tuple[str, dict[str, Any]]]:
        try:
            if not select.select([self._socket], [], [], timeout_s)[0]:
                return []
            if self._descriptor < 0:
                data, descriptors, _, _ = socket.recv_fds(self._socket, MOST_AT_ONCE, 1)
                self._descriptor = descriptors[0] if descriptors else -1
            else:
                data = self._socket.recv(MOST_AT_ONCE)
        except BlockingIOError:
            return []
        except (OSError, ValueError):
            data = b""
        if not data:
            self.gone = True
            return []
        *lines, self._rest = (self._rest + data).split(b"\n")
        if len(self._rest) > messages.LONGEST_TOLD:
            self.gone = True
            return []
        heard = []
        for line in lines:
            try:
                heard.append(messages.read(line, messages.TOLD, messages.LONGEST_TOLD))
            except messages.Unfit:
                continue
        return heard


__all__ = ["Client", "NotThere", "Stranger", "Unreadable"]
