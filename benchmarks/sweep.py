"""How long does a sweep take: 200 runs of the workshop bar, by one process and by two, and killed on the way?

What a run costs above its bare march is the whole time of the sweep by one process, divided by the
runs, less the mean march. Kills are at random moments; after each the same command goes on, and at
the end the table has to be that of a sweep that nothing disturbed.
"""

from __future__ import annotations

import json
import os
import random
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from table import Tables, options

CASE = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"
SURFACE = "stages.freeze.surfaces.outside"


def plan(coolants: int, agitations: int, keep: str = "") -> str:
    return f"""schema = 1
case = "{CASE}"
[vary.coolant]
key = "{SURFACE}.coolant"
from = "-30 degC"
to = "-18 degC"
count = {coolants}
[vary.h]
key = "{SURFACE}.h"
from = "120 W/m2/K"
to = "1000 W/m2/K"
count = {agitations}
spacing = "log"
{keep}"""


def command(place: Path, into: str, processes: int) -> list[str]:
    return [
        sys.executable, "-m", "fem.cli", "sweep", str(place / "plan.toml"), "--into", str(place / into),
        "--processes", str(processes),
    ]  # fmt: skip


def swept(place: Path, into: str, processes: int) -> float:
    began = time.perf_counter()
    subprocess.run(command(place, into, processes), check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - began


def marches(place: Path, into: str) -> list[float]:
    found = (place / into / "runs").glob("*/summary.json")
    return [json.loads(path.read_text())["effort"]["march_s"] for path in found]


def killed(place: Path, times: int, whole: float) -> tuple[int, int, bool]:
    """Kill a sweep; return runs lost in mid-run, finished runs done again, and whether the table is whole."""
    stamps: dict[str, int] = {}
    lost = again = 0
    for _ in range(times):
        process = subprocess.Popen(
            command(place, "killed", 2),
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            start_new_session=True,
        )
        time.sleep(random.uniform(1.5, 2.0 * whole / times))
        os.killpg(process.pid, signal.SIGKILL)
        process.wait()
        lost += len(list((place / "killed" / "runs").glob(".part-*")))
        now = {
            p.parent.name: p.stat().st_mtime_ns
            for p in (place / "killed" / "runs").glob("[!.]*/summary.json")
        }
        again += sum(now[key] != stamp for key, stamp in stamps.items())
        stamps = now
    swept(place, "killed", 2)
    tables = [(place / into / "table.csv").read_bytes() for into in ("two", "killed")]
    return lost, again, tables[0] == tables[1]


def main() -> None:
    parser = options(__doc__)
    parser.add_argument("--coolants", type=int, default=20)
    parser.add_argument("--agitations", type=int, default=10)
    parser.add_argument("--kills", type=int, default=10)
    asked = parser.parse_args()
    tables = Tables(asked.json)
    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder)
        (place / "plan.toml").write_text(plan(asked.coolants, asked.agitations))
        runs = asked.coolants * asked.agitations
        seconds = {n: swept(place, into, n) for n, into in ((2, "two"), (1, "one"))}
        march = {n: sum(marches(place, into)) / runs for n, into in ((2, "two"), (1, "one"))}
        tables.add(
            f"{runs} runs of the workshop bar, curves and summaries kept",
            ["processes", "seconds", "mean march [s]", "a run above its march [s]", "faster than one"],
            [
                [n, seconds[n], march[n], n * seconds[n] / runs - march[n], seconds[1] / seconds[n]]
                for n in (1, 2)
            ],
        )
        standing = swept(place, "two", 2)
        tables.add(
            "The same command once all runs stand there",
            ["seconds", "a run [s]"],
            [[standing, standing / runs]],
        )
        lost, again, same = killed(place, asked.kills, seconds[2])
        tables.add(
            f"Killed {asked.kills} times at random moments",
            ["runs lost in mid-run", "finished runs done again", "the table is that of an undisturbed sweep"],
            [[lost, again, "yes" if same else "NO"]],
        )
    tables.close()


if __name__ == "__main__":
    main()
