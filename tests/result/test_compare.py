from __future__ import annotations

import csv
import io
import shutil
from pathlib import Path

import pytest

from fem.errors import CaseError
from fem.result.compare import Comparison, compare
from fem.run import run
from tests.pieces import small

OUTSIDE = "stages.freeze.surfaces.outside"


@pytest.fixture(scope="module")
def folders(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    root = tmp_path_factory.mktemp("runs")
    settings = {
        "plain": (),
        "stirred": (f"{OUTSIDE}.h=400 W/m2/K",),
        "sweeter": ("materials.mix.sucrose=24 %", "materials.mix.air=10 %"),
        "warm": (f"{OUTSIDE}.coolant=-10 degC", "title=<b>warm</b> bath"),
    }
    out = []
    for name, overrides in settings.items():
        case = small('watch.fields="none"', "aim.within=7 min", *overrides)
        run(case, root / name, numerical_error=False)
        out.append(root / name)
    return out


@pytest.fixture(scope="module")
def compared(folders: list[Path]) -> Comparison:
    return compare(folders)


def test_only_what_differs_is_listed(compared: Comparison) -> None:
    assert set(compared.keys) == {
        f"{OUTSIDE}.h",
        f"{OUTSIDE}.coolant",
        "materials.mix.sucrose",
        "materials.mix.air",
    }
    plain, _, sweeter, _ = compared.outcomes
    at = compared.keys.index("materials.mix.air")
    assert (plain.settings[at], sweeter.settings[at]) == ("–", "10 %")


def test_outcomes_are_those_of_the_folders(compared: Comparison) -> None:
    plain, stirred, sweeter, warm = compared.outcomes
    assert [o.verdict for o in (plain, stirred, warm)] == ["No", "Yes", "No"]
    assert stirred.time is not None
    assert plain.time is not None
    assert stirred.time < plain.time
    assert warm.time is None
    assert warm.slowest > -12.0
    assert sweeter.ice is not None
    assert plain.ice is not None
    assert sweeter.ice < plain.ice
    for o, run_ in zip(compared.outcomes, compared.runs, strict=True):
        assert o.heat_removed == run_.summary["heat_removed_J"]


def test_the_answer_names_the_fastest_and_who_does_not_reach_the_aim(compared: Comparison) -> None:
    said = compared.sentence()
    assert said.startswith("stirred is the fastest")
    assert "1 of 4 do not reach their aim" in said


def test_the_table_has_a_row_for_each_run_and_units_in_its_headers(compared: Comparison) -> None:
    rows = list(csv.DictReader(io.StringIO(compared.csv())))
    assert [row["run"] for row in rows] == ["plain", "stirred", "sweeter", "warm"]
    assert float(rows[1]["time to aim [s]"]) == pytest.approx(compared.outcomes[1].time)
    assert rows[3]["time to aim [s]"] == ""


def test_the_page_stands_alone_and_escapes_what_users_write(compared: Comparison, tmp_path: Path) -> None:
    page = compared.write(tmp_path / "out").read_text(encoding="utf-8")
    assert "<b>warm" not in page
    assert "&lt;b&gt;warm" in page
    assert "http" not in page.replace("http-equiv", "")
    assert page.count("data:image/svg+xml") == 4
    assert (tmp_path / "out" / "compare.png").read_bytes()[:4] == b"\x89PNG"
    with pytest.raises(CaseError, match="exists"):
        compared.write(tmp_path / "out")


def test_folders_of_one_name_are_told_apart_by_their_parents(folders: list[Path], tmp_path: Path) -> None:
    for side in ("left", "right"):
        shutil.copytree(folders[0], tmp_path / side / "bar")
    found = compare([tmp_path / "left" / "bar", tmp_path / "right" / "bar"])
    assert [o.name for o in found.outcomes] == ["left/bar", "right/bar"]
    assert found.keys == ()


def test_one_run_alone_and_no_run_folders_are_refused_all_at_once(
    folders: list[Path], tmp_path: Path
) -> None:
    with pytest.raises(CaseError, match="given 1 times"):
        compare(folders[:1])
    with pytest.raises(CaseError) as caught:
        compare([folders[0], tmp_path / "a", tmp_path / "b"])
    assert len(caught.value.problems) == 2


def test_different_aims_are_said(folders: list[Path], tmp_path: Path) -> None:
    run(small('watch.fields="none"', "aim.reach=-5 degC"), tmp_path / "other", numerical_error=False)
    found = compare([folders[0], tmp_path / "other"])
    assert any("different aims" in remark for remark in found.remarks)
