from __future__ import annotations

import errno
import os
import shutil
import signal
import subprocess
import sys
import textwrap
import time
from pathlib import Path
from types import SimpleNamespace
from xml.etree import ElementTree

import numpy as np
import pytest
import pyvista as pv

from fem.errors import CaseError
from fem.mesh.build import build
from fem.result import disk, fields
from fem.result.fields import VtuFrames
from fem.result.folder import open_run
from fem.result.frames import open_fields
from fem.result.hdf import SPARE, HdfFrames
from fem.result.section import Section
from fem.run import run
from tests.pieces import bar, ring, rod, slab, small

SHORT = ("stages.freeze.lasts=150 s", "watch.frames=60 s")
EVERY_FRAME = ["temperature_degC", "ice", "enthalpy_J_per_kg", "region"]
LAST_FRAME = ["frozen_at_s", "local_freezing_time_s"]

TUBE = """
schema = 1
title = "A small tube"
[piece]
section = "axisymmetric"
start_temperature = "4 degC"
[shape]
form = "rod"
radius = "10 mm"
height = "40 mm"
cell = "2 mm"
[regions]
product = "mix"
[materials.mix]
kind = "recipe"
sucrose = "18 %"
[[stages]]
name = "freeze"
lasts = "150 s"
[stages.surfaces.side]
exchange = "fluid"
h = "400 W/m2/K"
coolant = "-30 degC"
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("fields") / "out"
    with np.errstate(all="raise", under="ignore"):
        run(small(*SHORT), path)
    return path


def frames(folder: Path) -> list[pv.UnstructuredGrid]:
    series = open_fields(folder)
    return [series.read(i) for i in range(len(series.times))]


def area(grid: pv.UnstructuredGrid, region: int | None = None) -> float:
    cells = grid if region is None else grid.extract_cells(np.flatnonzero(grid["region"] == region))
    return float(cells.compute_cell_sizes(length=False, volume=False)["Area"].sum())


def test_there_is_a_frame_at_the_start_at_every_multiple_and_where_a_stage_ends(folder: Path) -> None:
    reader = pv.get_reader(str(folder / "fields.pvd"))
    assert reader.time_values == [0.0, 60.0, 120.0, 150.0]
    assert [float(frame.field_data["TimeValue"][0]) for frame in frames(folder)] == reader.time_values


def test_stages_that_end_on_a_frame_or_between_two_have_each_one_frame(tmp_path: Path) -> None:
    second = "\n[[stages]]\nname = 'rest'\nlasts = '45 s'\n"
    text = small().text.replace("[watch]", second + "[watch]", 1)
    run(small("stages.freeze.lasts=60 s", "watch.frames=30 s", text=text), tmp_path / "out")
    assert open_fields(tmp_path / "out").times == (0.0, 30.0, 60.0, 90.0, 105.0)


def test_every_frame_has_the_same_arrays_with_units_in_their_names_and_single_precision(folder: Path) -> None:
    *before, last = frames(folder)
    for frame in before:
        assert sorted(frame.point_data.keys() + frame.cell_data.keys()) == sorted(EVERY_FRAME)
    assert sorted(last.point_data.keys() + last.cell_data.keys()) == sorted(EVERY_FRAME + LAST_FRAME)
    assert {last.point_data[name].dtype for name in last.point_data} == {np.dtype(np.float32)}


def test_regions_and_their_names_stand_in_every_frame(folder: Path) -> None:
    areas = build(small().shape, 0.05).areas
    for frame in frames(folder):
        assert list(frame.field_data["region_names"]) == ["product", "wall"]
        assert np.issubdtype(frame["region"].dtype, np.integer)
        for number, name in enumerate(frame.field_data["region_names"]):
            assert area(frame, number) == pytest.approx(areas[name], rel=1e-5)


def test_the_whole_piece_is_written_in_metres(folder: Path) -> None:
    grid = frames(folder)[0]
    # 12 mm x 24 mm of product and 0.8 mm of wall on either side.
    np.testing.assert_allclose(grid.bounds, (-6.8e-3, 6.8e-3, -12.8e-3, 12.8e-3, 0.0, 0.0), rtol=1e-6)
    outline = 13.6e-3 * 25.6e-3 - (4.0 - np.pi) * 3.8e-3**2
    assert area(grid) == pytest.approx(outline, rel=5e-3)
    assert grid.extract_surface(algorithm="dataset_surface").connectivity()["RegionId"].max() == 0


def test_the_values_are_those_of_the_run(folder: Path) -> None:
    result = run(small(*SHORT, "watch.every=30 s"))
    mix = small().materials["mix"].build()
    for frame, when in zip(frames(folder), (0.0, 60.0, 120.0, 150.0), strict=True):
        row = result.curves["time [s]"].tolist().index(when)
        centre = int(np.argmin(np.hypot(*frame.points[:, :2].T)))
        T = float(frame["temperature_degC"][centre])
        assert pytest.approx(result.curves["point.centre [degC]"][row], abs=0.02) == T
        assert frame["ice"][centre] == pytest.approx(float(mix.ice(T)), abs=1e-4)
        expected = float(mix.curve.enthalpy(T)) / mix.density
        assert frame["enthalpy_J_per_kg"][centre] == pytest.approx(expected, rel=1e-3, abs=5.0)
        # The mould holds no ice; its enthalpy per mass is its own.
        wall = int(np.argmax(frame.points[:, 0]))
        assert frame["ice"][wall] == 0.0
        steel = 480.0 * float(frame["temperature_degC"][wall])
        assert frame["enthalpy_J_per_kg"][wall] == pytest.approx(steel, rel=1e-4)


def test_images_carry_the_values_of_the_solved_part(folder: Path) -> None:
    last = frames(folder)[-1]
    points = {tuple(np.round(p[:2] * 1e7).astype(int)): i for i, p in enumerate(last.points)}
    assert len(points) == last.n_points
    for (x, y), i in points.items():
        for image in ((-x, y), (x, -y), (-x, -y)):
            for name in ("temperature_degC", "frozen_at_s"):
                assert np.array_equal(last[name][points[image]], last[name][i], equal_nan=True)


def test_in_the_last_frame_the_product_has_frozen_from_the_outside_in(folder: Path) -> None:
    last = frames(folder)[-1]
    frozen = last["frozen_at_s"]
    inside = np.abs(last.points[:, 1]) < 1e-6
    x = np.abs(last.points[inside, 0])
    order = frozen[inside][np.argsort(x)][::-1]
    known = order[np.isfinite(order)]
    assert len(known) > 3
    assert np.all(np.diff(known) >= 0.0)
    assert np.isnan(frozen[int(np.argmax(last.points[:, 0]))])
    assert np.nanmax(frozen) <= 150.0


def test_an_axisymmetric_piece_shows_both_its_halves(tmp_path: Path) -> None:
    run(small(text=TUBE), tmp_path / "out")
    grid = frames(tmp_path / "out")[-1]
    np.testing.assert_allclose(grid.bounds[:4], (-10e-3, 10e-3, 0.0, 40e-3), atol=1e-8)
    assert area(grid) == pytest.approx(20e-3 * 40e-3, rel=1e-5)


@pytest.mark.parametrize(
    ("shape", "images", "axisymmetric"),
    [(bar(), 4, False), (slab(), 1, False), (rod(), 2, True), (ring(), 2, True)],
)
def test_a_section_is_whole_and_none_of_its_cells_is_turned_over(
    shape: object, images: int, axisymmetric: bool
) -> None:
    domain = build(shape, 1.0)  # type: ignore[arg-type]
    section = Section.of(domain)
    assert domain.axisymmetric is axisymmetric
    assert len(section.cells) == images * domain.mesh.t.shape[1]
    corners = section.points[section.cells]
    x, y = corners[..., 0], corners[..., 1]
    signed = 0.5 * (x * np.roll(y, -1, axis=1) - np.roll(x, -1, axis=1) * y).sum(axis=1)
    assert np.all(signed > 0.0)
    whole = 2.0 if axisymmetric else 1.0
    assert signed.sum() == pytest.approx(whole * sum(domain.areas.values()), rel=1e-12)
    solved = np.abs(domain.points[:, section.source].T)
    np.testing.assert_allclose(np.abs(section.points), solved, atol=1e-15)
    # No two nodes share a place: images are joined where they meet.
    assert len(np.unique(np.round(section.points * 1e9), axis=0)) == len(section.points)


def test_one_file_for_all_frames_holds_the_same(folder: Path, tmp_path: Path) -> None:
    run(small(*SHORT, "watch.fields=vtkhdf"), tmp_path / "out")
    assert not (tmp_path / "out" / "fields").exists()
    series = open_fields(tmp_path / "out")
    assert series.times == (0.0, 60.0, 120.0, 150.0)
    for i, expected in enumerate(frames(folder)):
        found = series.read(i)
        np.testing.assert_array_equal(found.points, expected.points)
        np.testing.assert_array_equal(found.cell_connectivity, expected.cell_connectivity)
        np.testing.assert_array_equal(found["region"], expected["region"])
        assert list(found.field_data["region_names"]) == ["product", "wall"]
        for name in expected.point_data:
            np.testing.assert_array_equal(found[name], expected[name])


def test_one_file_for_all_frames_does_not_grow_onto_a_full_disk(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    section = Section.of(build(slab(), 1.0))
    series = HdfFrames(tmp_path, section, {})
    values = {"ice": np.zeros(len(section.points), dtype=np.float32)}
    series.write(0, 0.0, values)
    free = SPARE + values["ice"].nbytes - 1
    monkeypatch.setattr(shutil, "disk_usage", lambda path: SimpleNamespace(free=free))
    with pytest.raises(OSError, match=r"No space left on device: .*fields\.vtkhdf"):
        series.write(1, 60.0, values)
    assert open_fields(tmp_path).times == (0.0,)
    free += 1
    series.write(1, 60.0, values)
    assert open_fields(tmp_path).times == (0.0, 60.0)


def test_names_of_regions_may_be_of_any_script(tmp_path: Path) -> None:
    section = Section.of(build(slab(), 1.0))
    names = np.array(["gelée", "лёд"])
    for kind in (VtuFrames, HdfFrames):
        folder = tmp_path / kind.__name__
        folder.mkdir()
        frames = kind(folder, section, {"region_names": names})
        frames.write(0, 0.0, {"ice": np.zeros(len(section.points), dtype=np.float32)})
        assert list(open_fields(folder).read(0).field_data["region_names"]) == list(names)


def test_fields_can_be_left_out(tmp_path: Path) -> None:
    run(small("stages.freeze.lasts=10 s", "watch.fields=none"), tmp_path / "out")
    assert not [p.name for p in (tmp_path / "out").iterdir() if p.name.startswith("fields")]
    with pytest.raises(CaseError, match="holds no fields"):
        open_fields(tmp_path / "out")


def test_a_run_without_a_folder_writes_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    run(small("stages.freeze.lasts=10 s"))
    assert list(tmp_path.iterdir()) == []


def test_one_file_without_its_library_is_refused_before_anything_is_written(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(fields, "find_spec", lambda name: None)
    with pytest.raises(CaseError, match="h5py"):
        run(small("watch.fields=vtkhdf"), tmp_path / "out")
    assert not (tmp_path / "out").exists()


def test_an_interrupted_run_ends_with_a_frame_of_where_it_stood(tmp_path: Path) -> None:
    def interrupt(time: float, *_: object) -> None:
        if time > 70:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run(small("watch.frames=60 s"), tmp_path / "out", progress=interrupt)
    series = open_fields(tmp_path / "out")
    assert series.times[:2] == (0.0, 60.0)
    assert set(LAST_FRAME) < set(series.read(len(series.times) - 1).point_data.keys())


def in_child(body: str, folder: Path) -> subprocess.Popen[str]:
    """Start a process that runs a small case of many frames into a folder."""
    text = textwrap.dedent(body).format(folder=str(folder))
    root = Path(__file__).parents[2]
    environment = {**os.environ, "PYTHONPATH": str(root)}
    return subprocess.Popen(
        [sys.executable, "-c", text], cwd=root, env=environment, text=True, stderr=subprocess.PIPE
    )


def test_a_killed_run_leaves_only_complete_frames(tmp_path: Path) -> None:
    body = """
        import time
        from fem.run import run
        from tests.pieces import small
        run(small("watch.frames=1 s"), {folder!r}, progress=lambda *a: time.sleep(0.002))
    """
    folder = tmp_path / "out"
    child = in_child(body, folder)
    deadline = time.monotonic() + 60
    while len(list(folder.glob("fields/*.vtu"))) < 5:
        assert time.monotonic() < deadline
        assert child.poll() is None
        # A viewer that looks now finds whole frames.
        if (folder / "fields.pvd").exists():
            frames(folder)
    child.send_signal(signal.SIGKILL)
    child.communicate()
    named = [e.attrib["file"] for e in ElementTree.parse(folder / "fields.pvd").iter("DataSet")]
    assert len(named) >= 4
    for grid in frames(folder):
        assert np.all(np.isfinite(grid["temperature_degC"]))
    assert len(frames(folder)) == len(named)


def test_a_disk_that_is_full_ends_in_an_error_that_names_the_file(tmp_path: Path) -> None:
    # A limit on the size of files stands for the full disk; the text of the case still fits.
    body = """
        import logging, resource
        from fem.run import run
        from tests.pieces import small
        case = small("watch.frames=20 s")
        resource.setrlimit(resource.RLIMIT_FSIZE, (4000, 4000))
        try:
            run(case, {folder!r})
        except OSError as error:
            assert not logging.getLogger("fem").handlers
            raise SystemExit("refused " + str(error.filename))
    """
    child = in_child(body, tmp_path / "out")
    _, said = child.communicate()
    assert said.splitlines()[-1] == f"refused {tmp_path / 'out' / 'fields' / '0000.vtu'}"
    assert not list((tmp_path / "out").rglob("*.part"))
    kept = open_run(tmp_path / "out").summary
    assert kept["outcome"] == "failed"
    assert kept["why"] == f"{tmp_path / 'out' / 'fields' / '0000.vtu'} could not be written: File too large"
    assert (tmp_path / "out" / "case.toml").read_text() == small("watch.frames=20 s").text


def test_a_folder_that_goes_away_is_an_error_that_names_the_file(tmp_path: Path) -> None:
    section = Section.of(build(slab(), 1.0))
    frames = VtuFrames(tmp_path, section, {})
    values = {"temperature_degC": np.zeros(len(section.points), dtype=np.float32)}
    frames.write(0, 0.0, values)
    (tmp_path / "fields" / "0000.vtu").unlink()
    (tmp_path / "fields").rmdir()
    with pytest.raises(OSError, match=r"0001\.vtu"):
        frames.write(1, 1.0, values)


def test_what_cannot_be_replaced_stays_as_it_was(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_: object) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    path = tmp_path / "fields.pvd"
    disk.replace(path, "before")
    monkeypatch.setattr(os, "replace", full)
    with pytest.raises(OSError, match=r"No space left on device: .*fields\.pvd"):
        disk.replace(path, "after")
    assert path.read_text() == "before"
    assert list(tmp_path.iterdir()) == [path]


def test_a_frame_is_replaced_whole(tmp_path: Path) -> None:
    section = Section.of(build(slab(), 1.0))
    frames = VtuFrames(tmp_path, section, {})
    for n, value in ((0, 1.0), (1, 2.0), (1, 3.0)):
        frames.write(n, 10.0 * n, {"ice": np.full(len(section.points), value, dtype=np.float32)})
    series = open_fields(tmp_path)
    assert series.times == (0.0, 10.0)
    assert series.read(1)["ice"][0] == 3.0


@pytest.mark.parametrize("kept", [0, 2000])
def test_a_frame_cut_short_is_said_in_a_sentence(folder: Path, tmp_path: Path, kept: int) -> None:
    text = (folder / "fields" / "0001.vtu").read_bytes()[:kept]
    (tmp_path / "fields").mkdir()
    (tmp_path / "fields" / "0001.vtu").write_bytes(text)
    (tmp_path / "fields.pvd").write_text((folder / "fields.pvd").read_text())
    series = open_fields(tmp_path)
    with pytest.raises(CaseError, match=r"0001\.vtu cannot be read: it is cut short or damaged"):
        series.read(1)
    with pytest.raises(CaseError, match=r"0002\.vtu is not in the folder"):
        series.read(2)


@pytest.mark.parametrize("text", [b"", b"no HDF5 at all"])
def test_one_file_that_is_damaged_is_said_in_a_sentence(tmp_path: Path, text: bytes) -> None:
    (tmp_path / "fields.vtkhdf").write_bytes(text)
    with pytest.raises(CaseError, match=r"fields\.vtkhdf cannot be read: it is cut short or damaged"):
        open_fields(tmp_path)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "cannot be read"),
        ("<VTKFile><Collection><DataSet file='a.vtu'/></Collection></VTKFile>", "cannot be read"),
        ("<VTKFile><Collection/></VTKFile>", "no frame yet"),
        ("<a><DataSet timestep='nan' file='a.vtu'/></a>", "not of this folder"),
        ("<a><DataSet timestep='1' file='../a.vtu'/></a>", "not of this folder"),
    ],
)
def test_an_index_that_was_changed_is_said_in_a_sentence(tmp_path: Path, text: str, said: str) -> None:
    (tmp_path / "fields.pvd").write_text(text)
    with pytest.raises(CaseError, match=said):
        open_fields(tmp_path)
