"""Work for processes to do, or to die of."""

from __future__ import annotations

import os
import signal
from pathlib import Path


def toy_work(task: tuple[str, str]) -> str:
    """Note that the task was begun, and do it; "once" kills its process the first time, "always" ever."""
    name, folder = task
    begun = Path(folder) / name
    first = not begun.exists()
    with begun.open("a") as file:
        file.write(f"{os.getpid()}\n")
    if name.startswith("always") or (name.startswith("once") and first):
        os.kill(os.getpid(), signal.SIGKILL)
    return f"{name} is done"
