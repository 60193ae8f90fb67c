"""``rimefront check``: what it prints, how fast, and what it refuses."""

from __future__ import annotations

import json
import re
import subprocess
import sys
from pathlib import Path

import meshio
import numpy as np
import pytest

from fem.case.read import load, loads
from fem.estimate.outlook import outlook
from fem.estimate.wording import details, sentence
from tests.conftest import CASES
from tests.pieces import SMALL, small

RIMEFRONT = (sys.executable, "-m", "fem.cli")


def rimefront(*args: str, cwd: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [*RIMEFRONT, *args], cwd=cwd, capture_output=True, text=True, timeout=60, check=False
    )


def test_the_first_sentence_is_the_answer() -> None:
    assert sentence(outlook(load(CASES / "workshop_bar.toml"))) == (
        "By hand about 19.0 min (Pham), at least 13.9 min (Plank), of 20 min given; the coolant film is the "
        "largest resistance (55 %): agitation, or faster air, is the knob."
    )


def test_what_rules_names_the_knob() -> None:
    def of(*overrides: str) -> str:
        return sentence(outlook(small(*overrides)))

    assert "the product is the largest" in of("stages.freeze.surfaces.outside.h=2000 W/m2/K")
    assert "a thinner piece is the knob" in of("stages.freeze.surfaces.outside.h=2000 W/m2/K")
    plastic = ("materials.stainless.conductivity=0.2 W/m/K", "shape.wall=2 mm")
    assert "the wall is the largest" in of(*plastic)
    assert "a thinner or better conducting one is the knob" in of(*plastic)


def test_a_method_outside_its_range_says_so_in_the_sentence() -> None:
    assert "(Pham, outside its range)" in sentence(outlook(load(CASES / "fruit_bar.toml")))


def test_without_a_method_the_sentence_says_why() -> None:
    text = sentence(outlook(load(CASES / "fluted_bar.toml")))
    assert text.startswith("By hand nothing can be said: no hand method knows a shape from a mesh file;")


def test_masses_volumes_and_counts_are_those_of_the_run() -> None:
    said = outlook(load(CASES / "workshop_bar.toml"))
    # 95 g: common practice, no source.
    assert said["mass_kg"]["product"] == pytest.approx(0.095, rel=0.01)
    assert said["volume_m3"]["product"] == pytest.approx(said["mass_kg"]["product"] / 1075.0)
    assert said["biot"] == pytest.approx(1.60, rel=0.02)  # worked by hand with k = 1.70 W/m/K
    assert said["mesh"]["cells"] > 0.9 * said["mesh"]["nodes"] > 1000
    assert said["cautions"]


def test_the_chart_of_resistances_is_to_scale() -> None:
    lines = dict(details(outlook(load(CASES / "mould_swap.toml"))))
    marks = {label: text.count("#") for label, text in lines.items() if label.startswith("resistance")}
    assert marks == {"resistance: product": 6, "resistance: wall": 12, "resistance: coolant film": 7}


def test_a_coarse_mesh_is_a_caution() -> None:
    coarse, fine = (outlook(small(f"shape.cell={cell}"))["cautions"] for cell in ("3 mm", "0.5 mm"))
    assert any(re.search(r"only about [45] cells lie between", caution) for caution in coarse)
    assert not any("cells lie between" in caution for caution in fine)


def test_a_nearly_flat_cell_is_a_caution(tmp_path: Path) -> None:
    corners = np.array([[0, 0], [20, 0], [20, 20], [0, 20], [10, 0.2]])
    cells = np.array([[0, 1, 4], [1, 2, 4], [2, 3, 4], [3, 0, 4]])
    lines = np.array([[0, 1], [1, 2], [2, 3], [3, 0]])
    tags = [np.full(4, 1), np.full(4, 2)]
    meshio.Mesh(
        np.column_stack([corners, np.zeros(5)]),
        [("triangle", cells), ("line", lines)],
        cell_data={"gmsh:physical": tags, "gmsh:geometrical": tags},
        field_data={"product": np.array([1, 2]), "outside": np.array([2, 1])},
    ).write(tmp_path / "flat.msh", file_format="gmsh22")
    form = '[shape]\nform = "mesh"\nfile = "flat.msh"\nlength_unit = "mm"\n[regions]\nproduct = "mix"\n'
    text = SMALL.split("[shape]")[0] + form + SMALL[SMALL.index("[materials.mix]") :]
    text = text.split("[watch.points]")[0] + text[text.index("[aim]") :]
    cautions = outlook(loads(text, "flat.toml", tmp_path))["cautions"]
    assert any("nearly flat (quality 0.02" in caution for caution in cautions)


@pytest.fixture
def place(tmp_path: Path) -> Path:
    (tmp_path / "pop.toml").write_text(SMALL, encoding="utf-8")
    return tmp_path


def test_check_prints_and_writes_nothing(place: Path) -> None:
    done = rimefront("check", "pop.toml", cwd=place)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.startswith("By hand about ")
    assert "by Pham" in done.stdout
    assert [p.name for p in place.iterdir()] == ["pop.toml"]


def test_json_stands_alone_and_overrides_count(place: Path) -> None:
    found = []
    for coolant in ("-20 degC", "-30 degC"):
        done = rimefront(
            "check",
            "pop.toml",
            "--json",
            "--set",
            f"stages.freeze.surfaces.outside.coolant={coolant}",
            cwd=place,
        )
        assert done.stderr.startswith("By hand about ")
        found.append(json.loads(done.stdout)["estimates"][1]["time_s"])
    assert found[1] < 0.75 * found[0]


@pytest.mark.parametrize(
    ("args", "said"),
    [
        (("check", "none.toml"), "none.toml"),
        (("check", "pop.toml", "--set", "shape.corner=9 mm"), "shape.corner"),
        (
            ("check", "pop.toml", "--set", "watch.points.centre=['6.7 mm', '12.7 mm']"),
            '"centre" lies outside',
        ),
    ],
)
def test_what_is_wrong_ends_with_2(place: Path, args: tuple[str, ...], said: str) -> None:
    done = rimefront(*args, cwd=place)
    assert done.returncode == 2
    assert said in done.stderr
    assert "Traceback" not in done.stderr


def test_it_takes_less_than_a_second_and_a_half_of_work(place: Path) -> None:
    # Work of the processor, and not the clock: other programs may run beside a test.
    code = (
        "import sys, time; from click.testing import CliRunner; from fem.cli import rimefront;"
        f"done = CliRunner().invoke(rimefront, ['check', {str(CASES / 'workshop_bar.toml')!r}]);"
        "assert done.exit_code == 0, done.output;"
        "heavy = {'matplotlib', 'pyvista', 'vtk', 'meshio', 'h5py'} & set(sys.modules);"
        "assert not heavy, heavy;"
        "print(time.process_time())"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=False
    )
    assert done.returncode == 0, done.stderr
    assert float(done.stdout) < 1.5
