"""How every benchmark prints its tables and writes them as JSON."""

from __future__ import annotations

import argparse
import datetime
import json
import os
import platform
from collections.abc import Sequence
from pathlib import Path
from typing import Any

Row = Sequence[Any]

# Before numpy: two threads are slower than one on matrices of this size, and peers get one too.
for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_name] = "1"


def options(question: str | None) -> argparse.ArgumentParser:
    """Return the parser of a benchmark, with the option that all have."""
    parser = argparse.ArgumentParser(description=(question or "").split("\n")[0])
    parser.add_argument("--json", type=Path, metavar="FILE", help="write the tables as JSON too")
    return parser


def machine() -> str:
    """Return date, processor and versions, as they stand beside a table."""
    return (
        f"{datetime.date.today()}, {os.cpu_count()} cores {_processor()}, one thread, "
        f"Python {platform.python_version()}"
    )


def _processor() -> str:
    try:
        lines = Path("/proc/cpuinfo").read_text().splitlines()
    except OSError:
        return platform.processor() or platform.machine()
    return next((line.split(":")[1].strip() for line in lines if line.startswith("model name")), "")


class Tables:
    """The tables of one benchmark: printed as they come, written as JSON at the end."""

    def __init__(self, into: Path | None):
        self._into = into
        self._said: dict[str, Any] = {"machine": machine(), "tables": {}}
        print(machine(), flush=True)

    def add(self, title: str, columns: Sequence[str], rows: Sequence[Row]) -> None:
        """Print a table in Markdown and keep it."""
        texts = [[_text(x) for x in row] for row in rows]
        widths = [max(map(len, column)) for column in zip(columns, *texts, strict=True)]
        print(f"\n**{title}**\n")
        for cells in (columns, ["-" * w for w in widths], *texts):
            print("| " + " | ".join(cell.ljust(w) for cell, w in zip(cells, widths, strict=True)) + " |")
        self._said["tables"][title] = [dict(zip(columns, row, strict=True)) for row in rows]
        print(flush=True)

    def close(self) -> None:
        """Write the JSON file, where one was asked for."""
        if self._into is not None:
            self._into.write_text(json.dumps(self._said, indent=2) + "\n", encoding="utf-8")


def _text(value: Any) -> str:
    if not isinstance(value, float):
        return str(value)
    return f"{value:.1f}" if abs(value) >= 1000.0 else f"{value:.3g}"
