"""Processes on this machine that do runs, each with a line of its own to whoever hands them out.

An executor of the standard library loses every pending run with one killed process, and cannot say
which run it was doing. Here the line that breaks belongs to one process, and so to one run.
"""

from __future__ import annotations

import os
import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from multiprocessing import connection, get_context, parent_process
from typing import Any, Generic, TypeVar

T = TypeVar("T")
R = TypeVar("R")
_READY = "ready"
_THREADS = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")


class Lost:
    """What comes back of a run whose process was lost twice.

    Parameters
    ----------
    exit_code
        Of the process; minus the signal's number where it was killed.

    """

    def __init__(self, exit_code: int | None):
        self.exit_code = exit_code

    def __str__(self) -> str:
        if self.exit_code is not None and self.exit_code < 0:
            how = f"killed by signal {-self.exit_code}, often for want of memory"
        else:
            how = f"it ended with exit code {self.exit_code}"
        return f"its process was lost twice, the second time with no other beside it ({how})"


class Processes(Generic[T, R]):
    """A number of processes that do one thing.

    Parameters
    ----------
    work
        A function of a module, which each process imports once; it does not raise.
    count
        How many processes.

    """

    def __init__(self, work: Callable[[T], R], count: int):
        self._work, self._count = work, count
        self._workers: list[_Worker] = []

    def run(self, tasks: Iterator[T]) -> Iterator[tuple[T, R | Lost]]:
        """Do tasks; yield each with its result as it comes.

        A task whose process is lost is done once more at the end, by itself. Closing the generator
        ends the processes at once.
        """
        again: list[T] = []
        try:
            # One task is made ready while the processes are busy.
            ahead = next(tasks, None)
            self._workers = [_Worker(self._work) for _ in range(self._count if ahead is not None else 0)]
            while True:
                for worker in self._workers:
                    if worker.task is None and ahead is not None:
                        worker.begin(ahead)
                        ahead = next(tasks, None)
                if not any(w.task is not None for w in self._workers):
                    break
                for task, result in self._arrived():
                    if isinstance(result, Lost):
                        again.append(task)
                    else:
                        yield task, result
            self._end()
            yield from self._alone(again)
        finally:
            self._end()

    def _arrived(self) -> Iterator[tuple[T, R | Lost]]:
        """Wait for processes to answer or to be lost, and replace those."""
        lines = connection.wait([w.line for w in self._workers if w.task is not None])
        for n, worker in enumerate(self._workers):
            if worker.line in lines:
                task, result = worker.task, worker.result()
                if isinstance(result, Lost):
                    self._workers[n] = _Worker(self._work)
                yield task, result

    def _alone(self, tasks: list[T]) -> Iterator[tuple[T, R | Lost]]:
        for task in tasks:
            if not self._workers:
                self._workers = [_Worker(self._work)]
            self._workers[0].begin(task)
            result = self._workers[0].result()
            if isinstance(result, Lost):
                self._workers = []
            yield task, result

    def _end(self) -> None:
        for worker in self._workers:
            worker.end()
        self._workers = []


class _Worker:
    """A process and the line to it."""

    def __init__(self, work: Callable[[Any], Any]):
        context = get_context("spawn")
        self.line, theirs = context.Pipe()
        self.task: Any = None
        self._process = context.Process(target=_serve, args=(theirs, work), daemon=True)
        with _one_thread():
            self._process.start()
        theirs.close()
        self._ready = False

    def begin(self, task: Any) -> None:
        self.task = task
        # A process that is gone is found out when its answer is waited for.
        with suppress(OSError):
            self.line.send(task)

    def result(self) -> Any:
        """Return what the process says of its task, or that it was lost."""
        try:
            if not self._ready:
                self._ready = self.line.recv() == _READY
            said = self.line.recv()
        except (EOFError, OSError):
            self.end()
            if not self._ready:
                told = (
                    f"a process of the sweep could not start (exit code {self._process.exitcode}); a script "
                    'that sweeps keeps its own work under if __name__ == "__main__":'
                )
                raise RuntimeError(told) from None
            said = Lost(self._process.exitcode)
        self.task = None
        return said

    def end(self) -> None:
        self.line.close()
        if self._process.is_alive():
            self._process.kill()
        self._process.join()


@contextmanager
def _one_thread() -> Iterator[None]:
    """Let processes that start here have one BLAS thread each."""
    before = {name: os.environ.get(name) for name in _THREADS}
    os.environ.update(dict.fromkeys(_THREADS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


def _serve(line: connection.Connection, work: Callable[[Any], Any]) -> None:
    """Do tasks until the line is closed."""
    # The keyboard interrupts whoever hands out the tasks, and that one ends this process.
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with_parent, daemon=True).start()
    line.send(_READY)
    with suppress(EOFError, OSError):
        while True:
            line.send(work(line.recv()))


def _end_with_parent() -> None:
    """End at once when the process that hands out the tasks is gone: its run would be orphaned."""
    parent = parent_process()
    assert parent is not None
    connection.wait([parent.sentinel])
    os._exit(1)
