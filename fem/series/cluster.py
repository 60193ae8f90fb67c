"""Runs of a sweep on a dask.distributed scheduler; its workers need no disk in common with us."""

from __future__ import annotations

import itertools
import re
import socket
from collections.abc import Callable, Iterator
from typing import Any, Generic, TypeVar

from fem.errors import CaseError, Problem

T = TypeVar("T")
R = TypeVar("R")
CONNECT_S = 20.0
_ADDRESS = re.compile(r"(?:tcp|tls)://(\[[\da-fA-F:]+\]|[^\s/:]+):(\d+)")
# So many tasks wait with the scheduler for each thread of its workers.
QUEUED = 3


class Cluster(Generic[T, R]):
    """A scheduler that is running elsewhere.

    Parameters
    ----------
    work
        A function of a module that every worker can import.
    address
        Of the scheduler, such as "tcp://10.0.0.5:8786".

    Raises
    ------
    CaseError
        Where nothing listens at the address.

    """

    def __init__(self, work: Callable[[T], R], address: str):
        self._work, self._address = work, address
        match = _ADDRESS.fullmatch(address)
        if match is None:
            told = f"is written tcp://HOST:PORT, such as tcp://127.0.0.1:8786, got {address}"
            raise CaseError("sweep", [Problem("--cluster", told)])
        # A client takes its time to give up, and then complains of itself.
        try:
            socket.create_connection((match[1].strip("[]"), int(match[2])), CONNECT_S).close()
        except (OSError, OverflowError) as error:
            raise CaseError("sweep", [Problem("--cluster", self._silent(error))]) from error

    def run(self, tasks: Iterator[T]) -> Iterator[tuple[T, R | str]]:
        """Do tasks; yield each with its result, or with the reason for having none.

        The scheduler gives the tasks of a lost worker to another one.

        Raises
        ------
        CaseError
            Where distributed is not installed, or no scheduler answers.

        """
        client = self._connect()
        try:
            from distributed import as_completed

            going: dict[Any, T] = {}
            arriving = as_completed(loop=client.loop)

            def submit(more: Iterator[T]) -> None:
                for task in more:
                    future = client.submit(self._work, task, pure=False)
                    going[future] = task
                    arriving.add(future)

            submit(itertools.islice(tasks, self._room(client)))
            for future in arriving:
                task = going.pop(future)
                result = future.result() if future.status == "finished" else _said(future)
                future.release()
                yield task, result
                submit(itertools.islice(tasks, max(0, self._room(client) - len(going))))
        finally:
            # What still runs is of no use to anyone once nobody waits for it.
            client.close()

    def _connect(self) -> Any:
        try:
            from distributed import Client
        except ImportError as error:
            told = "needs distributed: pip install 'rimefront[cluster]'"
            raise CaseError("sweep", [Problem("--cluster", told)]) from error
        try:
            return Client(self._address, timeout=CONNECT_S, set_as_default=False)
        except (OSError, ValueError, TimeoutError) as error:
            raise CaseError("sweep", [Problem("--cluster", self._silent(error))]) from error

    def _silent(self, error: Exception) -> str:
        return f"no scheduler answers at {self._address}: {error}"

    @staticmethod
    def _room(client: Any) -> int:
        return max(4, QUEUED * sum(client.nthreads().values()))


def _said(future: Any) -> str:
    try:
        error = future.exception()
    # Of a future that was cancelled there is no exception to be had: it is raised.
    except Exception as raised:
        error = raised
    return f"lost on the cluster: {type(error).__name__}: {error}"
