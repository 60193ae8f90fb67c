"""Work for processes to do, or to die of."""

from __future__ import annotations

import os
import signal
import time
from pathlib import Path

from fem.series.workers import Processes


def toy_work(task: tuple[str, str]) -> str:
    """Note that the task was begun, and do it.

    One called "once" kills its process the first time, "always" every time, "long" takes a minute.
    """
    name, folder = task
    begun = Path(folder) / name
    first = not begun.exists()
    with begun.open("a") as file:
        file.write(f"{os.getpid()}\n")
    if name.startswith("always") or (name.startswith("once") and first):
        os.kill(os.getpid(), signal.SIGKILL)
    if name.startswith("long"):
        time.sleep(60)
    return f"{name} is done"


def hand_out(folder: str) -> None:
    """Hand out one long task."""
    list(Processes(toy_work, 1).run(iter([("long", folder)])))
