from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from fem.result.answer import sentence
from fem.result.folder import open_run
from tests.pieces import SMALL

RIMEFRONT = (sys.executable, "-m", "fem.cli")


def rimefront(*args: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [*RIMEFRONT, *args], cwd=cwd, capture_output=True, text=True, timeout=120, check=False
    )


@pytest.fixture
def place(tmp_path: Path) -> Path:
    (tmp_path / "pop.toml").write_text(SMALL, encoding="utf-8")
    return tmp_path


def test_a_run_answers_first_and_is_quiet_in_a_pipe(place: Path) -> None:
    done = rimefront("run", "pop.toml", cwd=place)
    assert done.returncode == 0
    assert done.stdout.startswith("The slowest point reaches -12 degC after ")
    assert done.stderr == ""
    names = {p.name for p in (place / "runs" / "pop").iterdir()}
    assert {"case.toml", "summary.json", "curves.csv", "fronts.csv", "log.txt", "fields.pvd"} <= names


def test_a_second_run_gets_a_folder_of_its_own(place: Path) -> None:
    for _ in range(2):
        rimefront("run", "pop.toml", "--set", "stages.freeze.lasts=20 s", cwd=place)
    assert sorted(p.name for p in (place / "runs").iterdir()) == ["pop", "pop-2"]


def test_json_stands_alone_on_standard_output(place: Path) -> None:
    done = rimefront("run", "pop.toml", "--json", "--into", "out", cwd=place)
    summary = json.loads(done.stdout)
    assert summary == json.loads((place / "out" / "summary.json").read_text())
    assert done.stderr.startswith("The slowest point reaches")


def test_an_aim_that_is_missed_is_an_answer_and_not_a_failure(place: Path) -> None:
    done = rimefront("run", "pop.toml", "--set", "aim.within=2 min", cwd=place)
    assert done.returncode == 0
    assert "; no, 2 min is not enough" in done.stdout


@pytest.mark.parametrize(
    ("args", "said"),
    [
        (("run", "none.toml"), "none.toml"),
        (("run", "pop.toml", "--set", "stages.freeze.surfaces.outside.h=-35 W/m2/K"), "must be above 0"),
        (("run", "pop.toml", "--set", "stages.frees.lasts=2 min"), "freeze"),
        (("run", "pop.toml", "--into", "."), "exists"),
        (("run",), "CASE"),
        (("runn", "pop.toml"), "runn"),
    ],
)
def test_what_is_wrong_is_said_with_exit_2_and_nothing_is_written(
    place: Path, args: tuple[str, ...], said: str
) -> None:
    done = rimefront(*args, cwd=place)
    assert done.returncode == 2
    assert said in done.stderr
    assert "Traceback" not in done.stderr
    assert [p.name for p in place.iterdir()] == ["pop.toml"]


def test_overrides_reach_the_case_in_the_folder(place: Path) -> None:
    rimefront(
        "run", "pop.toml", "--into", "out", "--set", "stages.freeze.surfaces.outside.h=400 W/m2/K", cwd=place
    )
    assert 'h = "400 W/m2/K"' in (place / "out" / "case.toml").read_text()


LONG = SMALL.replace('cell = "1.5 mm"', 'cell = "0.2 mm"').replace('lasts = "10 min"', 'lasts = "20 h"')


def started(place: Path) -> subprocess.Popen[bytes]:
    (place / "long.toml").write_text(LONG, encoding="utf-8")
    process = subprocess.Popen(
        [*RIMEFRONT, "run", "long.toml", "--into", "out"],
        cwd=place,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )
    deadline = time.monotonic() + 60
    curves = place / "out" / "curves.csv"
    while time.monotonic() < deadline:
        if curves.exists() and len(curves.read_bytes().splitlines()) > 10:
            return process
        time.sleep(0.02)
    process.kill()
    raise AssertionError("the run did not start to write")


def test_a_killed_run_leaves_a_folder_that_opens_and_says_it_is_unfinished(place: Path) -> None:
    process = started(place)
    os.kill(process.pid, signal.SIGKILL)
    process.wait()
    kept = open_run(place / "out")
    assert kept.summary["outcome"] == "running"
    assert "unfinished" in kept.summary["why"]
    assert sentence(kept.summary).startswith("Unfinished")
    assert len(kept.curves["time [s]"]) > 5
    assert kept.curves["heat_removed [J]"][-1] > 0


def test_interrupting_from_the_keyboard_exits_130_and_keeps_the_folder(place: Path) -> None:
    process = started(place)
    process.send_signal(signal.SIGINT)
    assert process.wait(timeout=30) == 130
    assert open_run(place / "out").summary["outcome"] == "interrupted"


def test_a_folder_that_cannot_be_written_is_a_sentence_with_exit_1(place: Path) -> None:
    (place / "file").write_text("no folder")
    done = rimefront("run", "pop.toml", "--into", "file/out", cwd=place)
    assert done.returncode == 1
    assert "Traceback" not in done.stderr
    assert "file" in done.stderr


def test_help_loads_nothing_heavy() -> None:
    code = (
        "import sys; from click.testing import CliRunner; from fem.cli import rimefront;"
        "assert CliRunner().invoke(rimefront, ['--help']).exit_code == 0;"
        "heavy = {'numpy', 'scipy', 'skfem', 'pint', 'pydantic', 'rich', 'matplotlib', 'pyvista'};"
        "heavy &= set(sys.modules);"
        "assert not heavy, heavy"
    )
    subprocess.run([sys.executable, "-c", code], check=True, timeout=60)
