"""A few processes that do the work, each with a time limit; the event loop never waits for one."""

from __future__ import annotations

import asyncio
import multiprocessing
import os
import queue
import tempfile
import threading

from shiftpred.errors import ShiftpredError

__all__ = ["Busy", "Fault", "InlineWorkers", "OutOfTime", "Refused", "WorkerPool"]


class Refused(Exception):
    """The input was refused; `args[0]` is the message in its parts."""


class OutOfTime(Exception):
    """The work took longer than it may; the process that did it has been ended."""


class Busy(Exception):
    """No process became free in time."""


class Fault(Exception):
    """A fault of ours."""


def _run(name: str, asked: dict) -> tuple[str, object]:
    from shiftpred.web.answers import ANSWERS, build_error

    try:
        return "fine", ANSWERS[name](asked)
    except ShiftpredError as error:
        return "refused", build_error(error)
    except Exception as error:  # a fault of ours must not take the process along
        return "fault", f"{type(error).__name__}: {error}"


def _serve(connection) -> None:
    import signal

    from shiftpred.web.answers import warm_up

    signal.signal(signal.SIGINT, signal.SIG_IGN)
    with tempfile.TemporaryDirectory(prefix="shiftpred-") as folder:
        os.chdir(folder)  # empty: no text can happen to be the name of a file here
        warm_up()
        connection.send("ready")
        while True:
            try:
                name, asked = connection.recv()
            except (EOFError, OSError):
                os.chdir(os.sep)
                return
            connection.send(_run(name, asked))


class _Worker:
    def __init__(self):
        context = multiprocessing.get_context("spawn")
        self.connection, other = context.Pipe()
        self.process = context.Process(target=_serve, args=(other,), daemon=True)
        self.process.start()
        other.close()
        self.ready = False

    def ask(self, name: str, asked: dict, seconds: float):
        if not self.ready:
            if not self.connection.poll(60):
                raise OutOfTime
            self.connection.recv()
            self.ready = True
        self.connection.send((name, asked))
        if not self.connection.poll(seconds):
            raise OutOfTime
        return self.connection.recv()

    def stop(self) -> None:
        self.connection.close()
        self.process.join(1)
        if self.process.is_alive():
            self.process.kill()
            self.process.join(5)


class WorkerPool:
    """Processes that answer; one that overruns its time is ended and replaced.

    Parameters
    ----------
    count : int
    seconds : float
        Longest that one answer may take.
    patience : float
        Longest that a request waits for a free process.
    """

    def __init__(self, count: int = 2, seconds: float = 20.0, patience: float = 20.0):
        self.seconds, self.patience, self.count = seconds, patience, count
        self._idle: queue.Queue = queue.Queue()
        self._all: set[_Worker] = set()
        self._lock = threading.Lock()

    def start(self) -> None:
        for _ in range(self.count):
            self._add()

    def stop(self) -> None:
        with self._lock:
            workers, self._all = self._all, set()
        for worker in workers:
            worker.stop()

    async def answer(self, name: str, asked: dict) -> dict:
        """Return the answer, or raise Refused, OutOfTime, Busy or Fault."""
        return _unpack(*await asyncio.to_thread(self._ask, name, asked))

    def _add(self) -> None:
        worker = _Worker()
        with self._lock:
            self._all.add(worker)
        self._idle.put(worker)

    def _ask(self, name: str, asked: dict):
        try:
            worker = self._idle.get(timeout=self.patience)
        except queue.Empty:
            raise Busy from None
        try:
            found = worker.ask(name, asked, self.seconds)
        except BaseException as error:
            with self._lock:
                self._all.discard(worker)
            worker.process.kill()
            worker.connection.close()
            self._add()
            if isinstance(error, EOFError | OSError):
                raise Fault("the process that did the work has ended") from error
            raise
        self._idle.put(worker)
        return found


class InlineWorkers:
    """The same in threads of this process, without a time limit: for tests and for embedding."""

    def start(self) -> None: ...

    def stop(self) -> None: ...

    async def answer(self, name: str, asked: dict) -> dict:
        return _unpack(*await asyncio.to_thread(_run, name, asked))


def _unpack(kind: str, found) -> dict:
    if kind == "refused":
        raise Refused(found)
    if kind == "fault":
        raise Fault(found)
    return found
