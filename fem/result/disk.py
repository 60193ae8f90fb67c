"""Files that are whole at any moment, and errors that name them."""

from __future__ import annotations

import errno
import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path


def replace(path: Path, text: str) -> None:
    """Write a file as a whole: a reader, or a kill, meets the old one or the new one.

    Raises
    ------
    OSError
        With the file's name; what stood there before still stands.

    """
    part = path.with_name(path.name + ".part")
    with naming(path):
        try:
            part.write_text(text, encoding="utf-8", newline="\n")
            os.replace(part, path)  # noqa: PTH105 - the atomic one
        except BaseException:
            part.unlink(missing_ok=True)
            raise


@contextmanager
def naming(path: Path) -> Iterator[None]:
    """Give errors of reading or writing the name of the file; a full disk comes without one."""
    try:
        yield
    except OSError as error:
        if error.filename == str(path):
            raise
        number = error.errno or errno.EIO
        raise OSError(number, os.strerror(number), str(path)) from error
