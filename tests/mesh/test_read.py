"""Mesh files: the usual formats give the mesh that was written, and broken ones a plain sentence."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import meshio
import numpy as np
import pytest

from fem.case.read import loads
from fem.errors import CaseError
from fem.mesh import read as reading
from fem.mesh.build import build
from fem.mesh.read import read
from fem.run import run
from tests.pieces import SMALL, bar, small

SHELF = Path(__file__).parent / "shelf"
FORMATS = {
    "2.2 text": ("gmsh22", False),
    "2.2": ("gmsh22", True),
    "4.1 text": ("gmsh", False),
    "4.1": ("gmsh", True),
}


def square(n: int = 4, side: float = 20.0, quads: bool = False) -> meshio.Mesh:
    """A square of n by n, its lower half "product" and its upper half "wall", "outside" all round [mm]."""
    x, y = np.meshgrid(np.linspace(0, side, n + 1), np.linspace(0, side, n + 1), indexing="ij")
    points = np.column_stack([x.ravel(), y.ravel(), np.zeros(x.size)])
    grid = np.arange(x.size).reshape(x.shape)
    cells = np.stack([grid[:-1, :-1], grid[1:, :-1], grid[1:, 1:], grid[:-1, 1:]], axis=-1).reshape(-1, 4)
    region = np.where(points[cells, 1].mean(axis=1) < side / 2, 1, 2)
    kind = "quad"
    if not quads:
        kind, region = "triangle", np.repeat(region, 2)
        cells = cells[:, [0, 1, 2, 0, 2, 3]].reshape(-1, 3)
    rim = np.concatenate([grid[:-1, 0], grid[-1, :-1], grid[:0:-1, -1], grid[0, :0:-1]])
    lines = np.column_stack([rim, np.roll(rim, -1)])
    return grouped(points, [(kind, cells, region), ("line", lines, np.full(len(lines), 3))])


def grouped(points: np.ndarray, blocks: list[tuple[str, np.ndarray, np.ndarray]]) -> meshio.Mesh:
    tags = [tag for _, _, tag in blocks]
    return meshio.Mesh(
        points,
        [(kind, cells) for kind, cells, _ in blocks],
        cell_data={"gmsh:physical": tags, "gmsh:geometrical": [t.copy() for t in tags]},
        field_data={"product": np.array([1, 2]), "wall": np.array([2, 2]), "outside": np.array([3, 1])},
    )


def written(mesh: meshio.Mesh, path: Path, file_format: str = "gmsh22", binary: bool = False) -> Path:
    if file_format == "gmsh":
        # Each group becomes an entity of its own, as version 4.1 wants it.
        mesh = by_entity(mesh)
    mesh.write(path, file_format=file_format, binary=binary)
    return path


def by_entity(mesh: meshio.Mesh) -> meshio.Mesh:
    blocks = []
    for block, tags in zip(mesh.cells, mesh.cell_data["gmsh:physical"], strict=True):
        blocks += [(block.type, block.data[tags == tag], tags[tags == tag]) for tag in np.unique(tags)]
    split = grouped(mesh.points, blocks)
    # Each node needs an entity; those of the areas will do.
    dims = np.column_stack([np.full(len(mesh.points), 2), np.ones(len(mesh.points), dtype=int)])
    for kind, cells, tags in blocks:
        dims[np.unique(cells)] = (2 if kind != "line" else 1, tags[0])
    split.point_data["gmsh:dim_tags"] = dims
    return split


def built_bar() -> meshio.Mesh:
    """The quarter of a bar that our own builder makes, as somebody else's mesh in mm."""
    domain = build(bar(cell="1.5 mm"), 0.05)
    tags = np.empty(domain.mesh.t.shape[1], dtype=int)
    tags[domain.regions["product"]], tags[domain.regions["wall"]] = 1, 2
    lines = domain.mesh.facets[:, domain.surfaces["outside"]].T
    points = np.column_stack([1e3 * domain.points.T, np.zeros(domain.points.shape[1])])
    return grouped(points, [("quad", domain.mesh.t.T, tags), ("line", lines, np.full(len(lines), 3))])


BAR_FORM = SMALL[SMALL.index('form = "bar"') : SMALL.index("[regions]")]
MESH_FORM = 'form = "mesh"\nfile = "bar.msh"\nlength_unit = "mm"\n'
AS_MESH = SMALL.replace(BAR_FORM, MESH_FORM).replace(
    'flat = { from = ["6 mm", "0 mm"]', 'flat = { from = ["11 mm", "0 mm"]'
)
AS_BAR = AS_MESH.replace(
    MESH_FORM,
    BAR_FORM.replace("12 mm", "22 mm").replace("24 mm", "50 mm").replace("3 mm", "6 mm"),
)


@pytest.fixture(scope="module")
def core_time() -> float:
    return float(run(small("stages.freeze.lasts=40 min", text=AS_BAR)).summary["aim"]["time_s"])


@pytest.mark.parametrize("name", FORMATS)
def test_a_bar_that_went_through_a_file_freezes_in_the_same_time(
    tmp_path: Path, name: str, core_time: float
) -> None:
    written(built_bar(), tmp_path / "bar.msh", *FORMATS[name])
    summary = run(small("stages.freeze.lasts=40 min", text=AS_MESH, folder=tmp_path)).summary
    assert summary["aim"]["time_s"] == pytest.approx(core_time, rel=1e-3)
    assert abs(summary["energy_imbalance"]) < 1e-10


@pytest.mark.parametrize("ending", [".msh", ".med"])
def test_every_format_gives_the_same_names(tmp_path: Path, ending: str) -> None:
    path = tmp_path / f"square{ending}"
    if ending == ".med":
        whole = square()
        tags = [-np.asarray(t) for t in whole.cell_data["gmsh:physical"]]
        med = meshio.Mesh(whole.points, whole.cells, cell_data={"cell_tags": tags})
        med.cell_tags = {-tag: [name] for name, (tag, _) in whole.field_data.items()}
        med.write(path)
    else:
        written(square(), path)
    grid = read(path)
    assert list(grid.regions) == ["product", "wall"]
    assert [len(cells) for cells in grid.regions.values()] == [16, 16]
    assert {name: edges.shape for name, edges in grid.surfaces.items()} == {"outside": (2, 16)}


def test_med_without_h5py_says_what_to_install(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "a.med").write_bytes(b"\x89HDF\r\n\x1a\n")
    monkeypatch.setattr(reading, "find_spec", lambda name: None)
    with pytest.raises(ValueError, match=r"a\.med: .*pip install h5py"):
        read(tmp_path / "a.med")


def test_harmless_faults_are_mended(tmp_path: Path) -> None:
    mesh = square()
    cells, lines = (block.data for block in mesh.cells)
    turned = cells.copy()
    turned[::3] = turned[::3, ::-1]
    points = np.vstack([mesh.points[::-1], [[500.0, 500.0, 70.0]]])  # the last is loose
    last = len(mesh.points) - 1
    tags = mesh.cell_data["gmsh:physical"]
    untidy = grouped(points, [("triangle", last - turned, tags[0]), ("line", last - lines[:, ::-1], tags[1])])
    one = read(written(mesh, tmp_path / "a.msh")).domain(1e-3, 0.05)
    two = read(written(untidy, tmp_path / "b.msh")).domain(1e-3, 0.05)
    assert one.areas == pytest.approx(two.areas)
    assert one.areas == pytest.approx({"product": 2e-4, "wall": 2e-4})
    assert two.points.shape == one.points.shape
    for domain in (one, two):
        assert domain.edge_areas("outside").sum() == pytest.approx(0.08 * 0.05)


def test_quadrilaterals_among_triangles_are_split_and_keep_area_and_names(tmp_path: Path) -> None:
    mesh = square(quads=True)
    cells, lines = (block.data for block in mesh.cells)
    tags = mesh.cell_data["gmsh:physical"]
    halves = cells[:5][:, [0, 1, 2, 0, 2, 3]].reshape(-1, 3)
    blocks = [
        ("quad", cells[5:], tags[0][5:]),
        ("triangle", halves, np.repeat(tags[0][:5], 2)),
        ("line", lines, tags[1]),
    ]
    grid = read(written(grouped(mesh.points, blocks), tmp_path / "a.msh"))
    assert grid.cells.shape == (3, 32)
    assert grid.domain(1e-3, 0.05).areas == pytest.approx({"product": 2e-4, "wall": 2e-4})


def test_groups_of_lines_and_of_areas_may_have_the_same_numbers(tmp_path: Path) -> None:
    mesh = square()
    mesh.cell_data["gmsh:physical"][1][:] = 1
    mesh.field_data["outside"] = np.array([1, 1])
    grid = read(written(mesh, tmp_path / "a.msh"))
    assert len(grid.regions["product"]) == 16
    assert grid.surfaces["outside"].shape == (2, 16)


def test_a_last_line_that_is_lost_is_no_loss(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "a.msh").write_bytes(good(tmp_path).removesuffix(b"$EndElements\n"))
    assert list(read(tmp_path / "a.msh").regions) == ["product", "wall"]
    # The reader itself would print a warning.
    assert capfd.readouterr() == ("", "")


def test_a_turned_section_becomes_a_body_of_revolution(tmp_path: Path) -> None:
    domain = read(written(square(), tmp_path / "a.msh")).domain(1e-3, None)
    assert domain.axisymmetric
    # Two ends of pi R2 and a side of 2 pi R h; the fourth edge lies on the axis.
    assert domain.edge_areas("outside").sum() == pytest.approx(2 * np.pi * 0.02**2 + 2 * np.pi * 0.02 * 0.02)


def moved(by: tuple[float, float, float] = (0, 0, 0), scale: float = 1.0) -> meshio.Mesh:
    mesh = square()
    mesh.points = mesh.points * scale + by
    return mesh


def without_names() -> meshio.Mesh:
    mesh = square()
    mesh.field_data = {}
    return mesh


def with_names(**names: tuple[int, int]) -> meshio.Mesh:
    mesh = square()
    mesh.field_data = {name: np.array(value) for name, value in names.items()}
    return mesh


Change = Callable[[np.ndarray, np.ndarray], tuple[np.ndarray, np.ndarray]]


def some_cells(change: Change, quads: bool = False) -> meshio.Mesh:
    mesh = square(quads=quads)
    tags = mesh.cell_data["gmsh:physical"]
    cells, own = change(mesh.cells[0].data.copy(), tags[0].copy())
    return grouped(mesh.points, [(mesh.cells[0].type, cells, own), ("line", mesh.cells[1].data, tags[1])])


def ungrouped(cells: np.ndarray, tags: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    tags[:3] = 0
    return cells, tags


def flattened(cells: np.ndarray, tags: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    return np.vstack([cells, [[0, 5, 10]]]), np.append(tags, 1)


def doubled(cells: np.ndarray, tags: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    return np.vstack([cells, cells[:1]]), np.append(tags, 2)


def folded(cells: np.ndarray, tags: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    cells[5] = cells[5, [0, 2, 1, 3]]
    return cells, tags


def with_hole_between(cells: np.ndarray, tags: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    keep = ~np.isin(np.arange(len(cells)) // 8, [1, 2])
    return cells[keep], tags[keep]


def second_order() -> meshio.Mesh:
    points = np.array([[0, 0, 0], [20, 0, 0], [0, 20, 0], [10, 0, 0], [10, 10, 0], [0, 10, 0]], dtype=float)
    return grouped(points, [("triangle6", np.array([[0, 1, 2, 3, 4, 5]]), np.array([1]))])


def solid() -> meshio.Mesh:
    points = np.vstack([np.zeros(3), 20 * np.eye(3)])
    mesh = grouped(points, [("tetra", np.array([[0, 1, 2, 3]]), np.array([1]))])
    mesh.field_data = {"product": np.array([1, 3])}
    return mesh


def lines_only() -> meshio.Mesh:
    mesh = square()
    return grouped(mesh.points, [("line", mesh.cells[1].data, mesh.cell_data["gmsh:physical"][1])])


def with_lines(lines: np.ndarray, tags: np.ndarray) -> meshio.Mesh:
    mesh = square()
    own = mesh.cell_data["gmsh:physical"][0]
    return grouped(mesh.points, [("triangle", mesh.cells[0].data, own), ("line", lines, tags)])


def line_inside() -> meshio.Mesh:
    lines = np.vstack([square().cells[1].data, [[2, 7], [7, 12]]])  # where product and wall meet
    return with_lines(lines, np.full(len(lines), 3))


def line_beside() -> meshio.Mesh:
    return with_lines(np.array([[0, 10]]), np.array([3]))


def lines_in_two() -> meshio.Mesh:
    lines = square().cells[1].data
    twice = with_lines(np.vstack([lines, lines[:2]]), np.append(np.full(len(lines), 3), [4, 4]))
    twice.field_data["flat"] = np.array([4, 1])
    return twice


def cracked() -> meshio.Mesh:
    """Product and wall each with its own nodes where they meet."""
    mesh = square()
    cells, tags = mesh.cells[0].data.copy(), mesh.cell_data["gmsh:physical"]
    middle = np.flatnonzero(mesh.points[:, 1] == 10.0)
    new = np.arange(len(mesh.points))
    new[middle] = len(mesh.points) + np.arange(len(middle))
    cells[tags[0] == 2] = new[cells[tags[0] == 2]]
    points = np.vstack([mesh.points, mesh.points[middle]])
    return grouped(points, [("triangle", cells, tags[0]), ("line", mesh.cells[1].data, tags[1])])


BROKEN: dict[str, tuple[Callable[[], meshio.Mesh], str]] = {
    "no names": (without_names, r"names no groups"),
    "names of lines only": (lambda: with_names(outside=(3, 1)), r"names no area"),
    "an area without name": (
        lambda: with_names(product=(1, 2), outside=(3, 1)),
        r"16 of 32 cells in no named group",
    ),
    "a line group without name": (lambda: with_names(product=(1, 2), wall=(2, 2)), r"16 lines in group 3"),
    "cells in no group": (lambda: some_cells(ungrouped), r"3 of 32 cells in no named group, one at \("),
    "a cell without area": (lambda: some_cells(flattened), r"1 of 33 cells without area, one at \(5, 0\)"),
    "a cell twice": (lambda: some_cells(doubled), r"lie on top of each other"),
    "a cell folded over": (lambda: some_cells(folded, quads=True), r"1 of 16 cells folded over, one at \("),
    "two parts": (lambda: some_cells(with_hole_between), r"2 parts that do not touch"),
    "second order": (second_order, r"second-order.*triangle6.*ElementOrder = 1"),
    "solid": (solid, r"solid cells \(tetra\)"),
    "lines only": (lines_only, r"no triangles or quadrilaterals"),
    "a surface inside": (line_inside, r'2 of 18 lines of "outside" inside the piece, one at \('),
    "lines that are no edges": (line_beside, r'lines in "outside" that are no edges'),
    "a line in two surfaces": (lines_in_two, r'both in "outside" and in "flat"'),
    "nodes not merged": (cracked, r"10 nodes that lie on top of another.*merge"),
    "tilted": (lambda: tilted(), r"not flat: z goes from 0 to 20"),
    "not a number": (lambda: moved((np.nan, 0, 0)), r"coordinates that are no numbers"),
}


def tilted() -> meshio.Mesh:
    mesh = square()
    mesh.points[:, 2] = mesh.points[:, 0]
    return mesh


@pytest.mark.parametrize("name", BROKEN)
def test_a_broken_mesh_is_one_sentence_at_its_place(tmp_path: Path, name: str) -> None:
    make, words = BROKEN[name]
    written(make(), tmp_path / "bar.msh")
    with pytest.raises(ValueError, match=words) as refused:
        read(tmp_path / "bar.msh")
    assert str(refused.value).startswith("bar.msh: ")
    assert "\n" not in str(refused.value)
    with pytest.raises(CaseError) as wrong:
        loads(AS_MESH, "pop.toml", tmp_path)
    assert [p.place for p in wrong.value.problems] == ["shape.file"]
    assert wrong.value.problems[0].line == AS_MESH[: AS_MESH.index("file = ")].count("\n") + 1


def good(tmp_path: Path, file_format: str = "gmsh22", binary: bool = False) -> bytes:
    return written(square(), tmp_path / "good.msh", file_format, binary).read_bytes()


RUBBISH: dict[str, tuple[Callable[[Path], bytes], str]] = {
    "empty": (lambda p: b"", r"is empty"),
    "text": (lambda p: b"thickness = 22 mm\n" * 50, r"no Gmsh file"),
    "zeros": (lambda p: bytes(4096), r"no Gmsh file"),
    "version 1": (lambda p: b"$NOD\n1\n1 0 0 0\n$ENDNOD\n", r"no Gmsh file"),
    "version 4.0": (
        lambda p: good(p).replace(b"2.2 0 8", b"4 0 8"),
        r"MSH version 4; save it as MSH 4\.1 or",
    ),
    "version 9": (
        lambda p: good(p).replace(b"2.2 0 8", b"9.0 0 8"),
        r"MSH version 9\.0; save it as MSH 4\.1",
    ),
    "beyond all sizes": (lambda p: good(p).replace(b"000e+01", b"000e+99"), r"beyond all sizes"),
    "cut in the nodes": (lambda p: good(p)[:400], r"cut short or damaged"),
    "cut in the cells": (lambda p: good(p)[:-200], r"cut short or damaged"),
    "cut, binary": (lambda p: good(p, "gmsh22", True)[:-300], r"cut short or damaged"),
    "cut, 4.1": (lambda p: good(p, "gmsh", False)[:-300], r"cut short or damaged"),
    "cut, 4.1 binary": (lambda p: good(p, "gmsh", True)[:-300], r"cut short or damaged"),
    "a name for lines and an area": (
        lambda p: good(p).replace(b'"outside"', b'"product"'),
        r'"product" for lines and for an area',
    ),
    "a name for two areas": (lambda p: good(p).replace(b'"wall"', b'"product"'), r'"product" for two groups'),
    "a node that is missing": (
        lambda p: good(p).replace(b"\n1 2 2 1 1 1 6 7\n", b"\n1 2 2 1 1 1 6 26\n"),
        r"damaged",
    ),
    "more nodes than memory": (
        lambda p: re.sub(rb"\$Nodes\n\d+", b"$Nodes\n900000000000", good(p)),
        r"cut short or damaged",
    ),
}


@pytest.mark.parametrize("name", RUBBISH)
def test_rubbish_is_one_sentence(tmp_path: Path, name: str, capfd: pytest.CaptureFixture[str]) -> None:
    make, words = RUBBISH[name]
    content = make(tmp_path)
    capfd.readouterr()
    (tmp_path / "bar.msh").write_bytes(content)
    with pytest.raises(ValueError, match=words) as refused:
        read(tmp_path / "bar.msh")
    assert "\n" not in str(refused.value)
    # The reader itself would print.
    assert capfd.readouterr() == ("", "")


def test_a_file_that_gmsh_wrote_is_read_with_its_names() -> None:
    # Gmsh 4.15: it holds a named point and the bounds of each entity, which are no surfaces of ours.
    grid = read(SHELF / "gmsh_41.msh")
    assert (list(grid.regions), list(grid.surfaces)) == (["product", "wall"], ["outside"])
    assert grid.domain(1e-3, 0.05).edge_areas("outside").sum() == pytest.approx(0.08 * 0.05)


def test_a_file_that_gmsh_saved_with_what_has_no_name_says_how_to_save_it() -> None:
    with pytest.raises(ValueError, match=r"in no named group.*without Mesh\.SaveAll"):
        read(SHELF / "gmsh_41_all.msh")


def test_what_cannot_be_a_mesh_file_is_not_opened(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(ValueError, match=r"none\.msh: is not there"):
        read(tmp_path / "none.msh")
    (tmp_path / "folder.msh").mkdir()
    with pytest.raises(ValueError, match="is no file"):
        read(tmp_path / "folder.msh")
    (tmp_path / "a.vtu").write_text("<VTKFile>")
    with pytest.raises(ValueError, match=r'"\.vtu" file, whose names.*are not read.*physical group'):
        read(tmp_path / "a.vtu")
    written(square(), tmp_path / "big.msh")
    monkeypatch.setattr(reading, "MOST_BYTES", 100)
    with pytest.raises(ValueError, match="are the most that can be read"):
        read(tmp_path / "big.msh")


def test_a_finer_mesh_than_can_be_run_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(reading, "MOST_NODES", 20)
    with pytest.raises(ValueError, match="has 25 nodes; 20 are the most"):
        read(written(square(), tmp_path / "big.msh"))


@pytest.mark.parametrize(
    ("unit", "words"),
    [
        ("m", r"the product 20 x 10 m; the same file would be in mm 20 x 10 mm, in inch 508 x 254 mm"),
        ("um", r"the product 0\.02 x 0\.01 mm; the same file would be in mm 20 x 10 mm"),
    ],
)
def test_the_wrong_unit_is_said_with_the_sizes_of_others(tmp_path: Path, unit: str, words: str) -> None:
    written(square(), tmp_path / "bar.msh")
    with pytest.raises(CaseError, match=words) as wrong:
        loads(AS_MESH.replace('"mm"', f'"{unit}"'), "pop.toml", tmp_path)
    assert [p.place for p in wrong.value.problems] == ["shape.length_unit"]


def test_a_thin_strip_across_a_piece_is_a_likely_size(tmp_path: Path) -> None:
    strip = square(8)
    strip.points[:, 1] *= 1.5 / 20.0
    assert read(written(strip, tmp_path / "a.msh")).unlikely(1e-3) is None


def test_an_axisymmetric_section_stays_on_one_side_of_its_axis(tmp_path: Path) -> None:
    written(moved((-5, 0, 0)), tmp_path / "bar.msh")
    text = AS_MESH.replace('section = "plane"\nlength = "50 mm"', 'section = "axisymmetric"')
    with pytest.raises(CaseError, match=r"shape\.file +has points at r = -5 mm"):
        loads(text, "pop.toml", tmp_path)


def test_names_of_case_and_file_are_held_against_each_other_all_at_once(tmp_path: Path) -> None:
    written(square(), tmp_path / "bar.msh")
    text = AS_MESH.replace('wall = "stainless"\n', 'walls = "stainless"\n')
    text = text.replace("surfaces.outside", "surfaces.outsid")
    with pytest.raises(CaseError) as wrong:
        loads(text, "pop.toml", tmp_path)
    said = {p.place: p.message for p in wrong.value.problems}
    assert 'region "wall" has no material' in said["regions"]
    assert 'no region "walls" (there is: product, wall); did you mean "wall"?' in said["regions.walls"]
    assert 'did you mean "outside"?' in said["stages.freeze.surfaces.outsid"]


def test_where_no_region_is_called_product_what_freezes_is(tmp_path: Path) -> None:
    from fem.plan import Plan

    mesh = square()
    mesh.field_data = {"mould": np.array([2, 2]), "pop": np.array([1, 2]), "outside": np.array([3, 1])}
    written(mesh, tmp_path / "bar.msh")
    text = AS_MESH.replace("[regions]\nproduct =", "[regions]\npop =").replace("wall = ", "mould = ")
    text = text.replace('["0 mm", "0 mm"]', '["1 mm", "1 mm"]')
    plan = Plan.of(loads(text, "pop.toml", tmp_path))
    assert plan.body.domain.product == ("pop",)
