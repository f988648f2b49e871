"""Work spread over the machine's cores: by this process and by others beside it, which live as long as it is wanted."""

import os
import signal
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from multiprocessing import get_context, parent_process
from multiprocessing.connection import Connection
from threading import Thread
from typing import Any

from player.takes.fitting import one_by_one

PATIENCE_S = 0.1
"""How often it is told how far others are, once this process has nothing left to do."""


class Cores:
    """As `one_by_one`, on all cores. The processes start when they are first of use, and end by `close`, or with this one.

    What is done, and its items and results, are pickled. Where no further process can be had, or one is lost, this process
    does the work of it.
    """

    def __init__(self, cores: int | None = None):
        """cores: how many; as many as this process may run on unless given"""
        self._others = max(0, (_cores() if cores is None else cores) - 1)
        self._workers: list[tuple[Any, Connection]] | None = None

    def __enter__(self) -> "Cores":
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def __call__(self, do: Callable[[Any], Any], items: Sequence[Any], tell: Callable[[int], None]) -> list[Any]:
        """`do` of each item. Raises what it raises."""
        if len(items) < 2 or not self._others:
            return one_by_one(do, items, tell)
        if self._workers is None:
            self._workers = list(self._started())
        todo, done = deque(enumerate(items)), dict[int, Any]()
        feeders = [Thread(target=self._feed, args=(pipe, do, todo, done), daemon=True) for _, pipe in self._workers]
        for feeder in feeders:
            feeder.start()
        while (job := _next(todo)) is not None:
            done[job[0]] = do(job[1])
            tell(len(done))
        for feeder in feeders:
            while feeder.is_alive():
                feeder.join(PATIENCE_S)
                tell(len(done))
        for number, item in enumerate(items):
            if number not in done:
                done[number] = do(item)
                tell(len(done))
        return [done[number] for number in range(len(items))]

    def close(self) -> None:
        """End the processes."""
        for process, pipe in self._workers or ():
            process.kill()
            process.join()
            pipe.close()
        self._workers = None

    def _started(self) -> Iterator[tuple[Any, Connection]]:
        # A fresh interpreter: a forked one would have the threads of this one cut off in it, and locks that they hold.
        context = get_context("spawn")
        for _ in range(self._others):
            mine, its = context.Pipe()
            process = context.Process(target=_work, args=(its,), daemon=True)
            try:
                with _undisturbed():
                    process.start()
            except (OSError, RuntimeError, AssertionError, ValueError):
                # No more processes, or none from within such a one as this: fewer cores, then.
                mine.close()
                return
            finally:
                its.close()
            yield process, mine

    @staticmethod
    def _feed(pipe: Connection, do: Callable[[Any], Any], todo: deque, done: dict[int, Any]) -> None:
        """Hand jobs to one process for as long as there are any; what it fails at is left undone."""
        with suppress(OSError, EOFError):
            while (job := _next(todo)) is not None:
                pipe.send((do, job[1]))
                good, result = pipe.recv()
                if good:
                    done[job[0]] = result


def _next(todo: deque) -> tuple[int, Any] | None:
    try:
        return todo.popleft()
    except IndexError:
        return None


def _cores() -> int:
    """How many cores this process may run on."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


@contextmanager
def _undisturbed() -> Iterator[None]:
    """A process that starts meanwhile hears of no interrupt by key: this one ends it."""
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    was = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, was)


def _work(pipe: Connection) -> None:
    """A process beside: jobs come, results go, until there is nobody there any more."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    Thread(target=_with_parent, daemon=True).start()
    with suppress(OSError, EOFError):
        while True:
            do, item = pipe.recv()
            try:
                answer = True, do(item)
            except Exception:
                # It is done once more where it was asked for, and fails there.
                answer = False, None
            pipe.send(answer)


def _with_parent() -> None:
    """Whoever has asked may be killed in the midst of a job; nobody wants the result then."""
    parent = parent_process()
    if parent is not None:
        parent.join()
        os._exit(1)
