"""How long does a command take before it does any work, and what do its imports cost?

Each command is run several times in a process of its own; the least time counts, for the rest
is the machine's. Imports are read off ``python -X importtime``, each with all that it imports.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

from table import Tables, options

CASE = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"
COMMANDS = {
    "python -c pass": None,
    "rimefront --help": ["--help"],
    "rimefront run --help": ["run", "--help"],
    "rimefront check": ["check", str(CASE)],
    "rimefront run --no-report": ["run", str(CASE), "--no-report", "--overwrite", "--into"],
    "rimefront run": ["run", str(CASE), "--overwrite", "--into"],
}
WATCHED = ("numpy", "scipy.sparse", "skfem", "pydantic", "pint", "pyamg", "qdldl", "pyvista", "fem.run")


def main() -> None:
    parser = options(__doc__)
    parser.add_argument("--repeats", type=int, default=3)
    asked = parser.parse_args()
    tables = Tables(asked.json)
    rows = [[name, *_times(arguments, asked.repeats)] for name, arguments in COMMANDS.items()]
    tables.add("Commands", ["command", "least [s]", "most [s]"], rows)
    tables.add("Imports of a run", ["module", "with all it imports [s]"], _imports())
    tables.close()


def _times(arguments: list[str] | None, repeats: int) -> tuple[float, float]:
    command = [sys.executable, *(["-c", "pass"] if arguments is None else ["-m", "fem.cli", *arguments])]
    seconds = []
    with tempfile.TemporaryDirectory() as folder:
        if command[-1] == "--into":
            command.append(f"{folder}/run")
        for _ in range(repeats):
            began = time.perf_counter()
            subprocess.run(command, check=True, capture_output=True)
            seconds.append(time.perf_counter() - began)
    return min(seconds), max(seconds)


def _imports() -> list[list[str | float]]:
    command = [sys.executable, "-X", "importtime", "-c", "import fem.case.read, fem.run"]
    said = subprocess.run(command, check=True, capture_output=True, text=True).stderr
    total = {}
    for line in said.splitlines():
        if line.startswith("import time:") and line.count("|") == 2:
            _, cumulative, name = line.removeprefix("import time:").split("|")
            total.setdefault(name.strip(), cumulative)
    return [[name, int(total[name]) / 1e6 if name in total else "not imported"] for name in WATCHED]


if __name__ == "__main__":
    main()
