from __future__ import annotations

import json
import os
import random
import signal
import subprocess
import sys
import time
from collections import Counter
from pathlib import Path

import pytest

import fem
from fem.series.sweep import Progress
from fem.series.workers import Lost, Processes
from tests.pieces import SMALL
from tests.series.test_sweep import PLAN
from tests.series.toy_work import toy_work

RUNS = 12


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    place = tmp_path_factory.mktemp("undisturbed")
    written(place)
    fem.sweep(place / "plan.toml", place / "out", processes=2)
    return place / "out"


def written(place: Path) -> None:
    (place / "small.toml").write_text(SMALL + 'within = "6 min"\n', encoding="utf-8")
    (place / "plan.toml").write_text(PLAN.replace("count = 3", "count = 4"), encoding="utf-8")


def begun(place: Path) -> subprocess.Popen[bytes]:
    written(place)
    return subprocess.Popen(
        [sys.executable, "-m", "fem.cli", "sweep", "plan.toml", "--into", "out", "--processes", "2"],
        cwd=place,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )


def finished(place: Path) -> set[str]:
    return {p.name for p in (place / "out" / "runs").glob("[!.]*")}


def wait_for(place: Path, count: int) -> None:
    deadline = time.monotonic() + 60
    while len(finished(place)) < count:
        assert time.monotonic() < deadline, "the sweep does not get on"
        time.sleep(0.002)


def test_a_killed_sweep_goes_on_where_it_stood(tmp_path: Path, undisturbed: Path) -> None:
    process = begun(tmp_path)
    wait_for(tmp_path, random.randint(1, RUNS - 3))
    os.killpg(process.pid, signal.SIGKILL)
    process.wait()
    before = {
        key: (tmp_path / "out/runs" / key / "summary.json").stat().st_mtime_ns for key in finished(tmp_path)
    }
    assert 0 < len(before) < RUNS
    assert not (tmp_path / "out" / "table.csv").exists()
    done = subprocess.run(
        [sys.executable, "-m", "fem.cli", "sweep", "plan.toml", "--into", "out", "--json"],
        cwd=tmp_path, capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert json.loads(done.stdout)["computed"] == RUNS - len(before)
    for key, stamp in before.items():
        assert (tmp_path / "out/runs" / key / "summary.json").stat().st_mtime_ns == stamp
    assert (tmp_path / "out/table.csv").read_bytes() == (undisturbed / "table.csv").read_bytes()
    assert not list((tmp_path / "out/runs").glob(".part*"))


def test_the_keyboard_ends_a_sweep_with_130_and_it_goes_on_later(tmp_path: Path, undisturbed: Path) -> None:
    process = begun(tmp_path)
    wait_for(tmp_path, 2)
    # From the keyboard the signal reaches every process of the session.
    os.killpg(process.pid, signal.SIGINT)
    assert process.wait(timeout=20) == 130
    swept = fem.sweep(tmp_path / "plan.toml", tmp_path / "out", processes=1)
    assert swept.summary["computed"] <= RUNS - 2
    assert (tmp_path / "out/table.csv").read_bytes() == (undisturbed / "table.csv").read_bytes()


def test_a_lost_process_costs_its_own_task_one_try_and_no_other_anything(tmp_path: Path) -> None:
    names = ["a", "b", "once 1", "c", "always", "d", "once 2", "e", "f"]
    results = dict(Processes(toy_work, 2).run(iter([(name, str(tmp_path)) for name in names])))
    said = {name: str(result) for (name, _), result in results.items()}
    assert isinstance(results["always", str(tmp_path)], Lost)
    assert "killed by signal 9" in said.pop("always")
    assert said == {name: f"{name} is done" for name in names if name != "always"}
    tries = Counter({name: len((tmp_path / name).read_text().splitlines()) for name in names})
    assert tries == {name: 2 if name.startswith(("once", "always")) else 1 for name in names}


def test_a_process_ends_in_mid_task_when_who_hands_out_is_gone(tmp_path: Path) -> None:
    code = (
        f"from tests.series.toy_work import hand_out\nif __name__ == '__main__': hand_out({str(tmp_path)!r})"
    )
    script = tmp_path / "script.py"
    script.write_text(code, encoding="utf-8")
    root = str(Path(__file__).parents[2])
    parent = subprocess.Popen([sys.executable, str(script)], env={**os.environ, "PYTHONPATH": root})
    begun, deadline = tmp_path / "long", time.monotonic() + 30
    while not (begun.exists() and begun.read_text().endswith("\n")):
        assert time.monotonic() < deadline
        time.sleep(0.01)
    child = Path("/proc") / begun.read_text().strip()
    assert child.exists()
    parent.kill()
    parent.wait()
    deadline = time.monotonic() + 5
    while child.exists() and "\nState:\tZ" not in (child / "status").read_text():
        assert time.monotonic() < deadline, "the process has outlived its parent"
        time.sleep(0.01)


def test_a_process_lost_in_mid_run_leaves_the_table_as_it_would_have_been(
    tmp_path: Path, undisturbed: Path
) -> None:
    written(tmp_path)
    killed = []

    def kill_one(seen: Progress) -> None:
        if seen.computed >= 3 and not killed:
            parts = list((tmp_path / "out/runs").glob(".part-*"))
            killed.extend(int(part.name.rsplit("-", 1)[1]) for part in parts[:1])
            for pid in killed:
                os.kill(pid, signal.SIGKILL)

    swept = fem.sweep(tmp_path / "plan.toml", tmp_path / "out", processes=2, progress=kill_one)
    assert killed
    assert swept.summary["computed"] == RUNS
    assert (tmp_path / "out/table.csv").read_bytes() == (undisturbed / "table.csv").read_bytes()


# Dask warns of its own old habits and of sockets that a killed worker has left.
@pytest.mark.filterwarnings("ignore")
def test_a_cluster_whose_worker_is_killed_gives_the_same_table(tmp_path: Path, undisturbed: Path) -> None:
    from distributed import LocalCluster

    written(tmp_path)
    killed = []
    with LocalCluster(
        n_workers=2, threads_per_worker=1, dashboard_address=None, silence_logs=60, host="127.0.0.1"
    ) as cluster:

        def kill_one(seen: Progress) -> None:
            if seen.computed == 3 and not killed:
                killed.append(cluster.workers[0].pid)
                os.kill(killed[0], signal.SIGKILL)

        address = cluster.scheduler_address
        swept = fem.sweep(tmp_path / "plan.toml", tmp_path / "out", cluster=address, progress=kill_one)
    assert killed
    assert swept.summary["computed"] == RUNS
    assert not swept.failed
    assert (tmp_path / "out/table.csv").read_bytes() == (undisturbed / "table.csv").read_bytes()
    assert finished(tmp_path) == {p.name for p in (undisturbed / "runs").iterdir()}
