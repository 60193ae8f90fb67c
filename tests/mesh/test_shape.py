"""Shapes: exact areas and volumes, names, and impossible dimensions."""

from __future__ import annotations

import math

import numpy as np
import pytest
from pydantic import ValidationError

from fem.mesh.form import CELLS_ACROSS
from fem.mesh.grid import Grid
from fem.mesh.shape import SHAPES, Bar, MeshShape, Ring, Rod, Slab

SQUARE = Grid(
    np.array([[0.0, 19.0, 19.0, 0.0], [0.0, 0.0, 19.0, 19.0]]),
    np.array([[0], [1], [2], [3]]),
    {"product": np.array([0])},
    {"left": np.array([[0], [3]])},
)
BAR = {"thickness": "22 mm", "width": "50 mm", "corner": "6 mm", "wall": "0.8 mm"}


def counted(thickness: float, width: float, corner: float, fine: int = 2000) -> float:
    """Area of a rounded rectangle by the midpoint rule along x: another way than the formula."""
    x = (np.arange(fine) + 0.5) / fine * thickness / 2
    into = np.maximum(x - (thickness / 2 - corner), 0.0)
    height = width / 2 - corner + np.sqrt(corner**2 - into**2)
    return float(4 * np.sum(height) * thickness / 2 / fine)


def test_a_rounded_bar_has_the_area_that_counting_gives() -> None:
    areas = Bar(**BAR).areas()
    assert areas["product"] == pytest.approx(counted(0.022, 0.050, 0.006), rel=1e-5)
    outer = counted(0.0236, 0.0516, 0.0068)
    assert areas["wall"] == pytest.approx(outer - areas["product"], rel=1e-3)
    # A wall of even thickness is its middle line times its thickness.
    middle = 2 * (22 + 50 - 4 * 6) * 1e-3 + 2 * math.pi * 6.4e-3
    assert areas["wall"] == pytest.approx(middle * 0.8e-3, rel=1e-9)
    assert Bar(**BAR).volumes(0.083)["product"] == pytest.approx(areas["product"] * 0.083)


def test_a_sharp_bar_keeps_its_corners() -> None:
    sharp = Bar(thickness="20 mm", width="40 mm", corner="0 mm", wall="1 mm")
    assert sharp.outer_corner == 0.0
    assert sharp.areas() == pytest.approx({"product": 8e-4, "wall": 22e-3 * 42e-3 - 8e-4})


def test_a_bar_may_be_round() -> None:
    assert Bar(thickness="20 mm", width="20 mm", corner="10 mm").areas()["product"] == pytest.approx(
        math.pi * 1e-4
    )


def test_volumes_of_revolution() -> None:
    rod = Rod(radius="14 mm", height="180 mm")
    assert rod.areas()["product"] == pytest.approx(0.014 * 0.18)
    assert rod.volumes()["product"] == pytest.approx(math.pi * 0.014**2 * 0.18)
    ring = Ring(inner="5 mm", outer="15 mm", height="10 mm")
    # Pappus: the area times the way of its middle.
    assert ring.volumes()["product"] == pytest.approx(ring.areas()["product"] * 2 * math.pi * 0.010)


def test_names_of_surfaces_and_regions() -> None:
    assert Slab(thickness="80 mm", width="2 mm").surfaces() == ("left", "right", "bottom", "top")
    assert Rod(radius="1 cm", height="1 cm").surfaces() == ("side", "bottom", "top")
    assert Ring(inner="1 cm", outer="2 cm", height="1 cm").surfaces() == (
        "inside",
        "outside",
        "bottom",
        "top",
    )
    assert Bar(**BAR).surfaces() == ("outside",)
    assert Bar(**BAR).regions() == ("product", "wall")
    assert Bar(thickness="22 mm", width="50 mm").regions() == ("product",)
    mesh = MeshShape(file=SQUARE, length_unit="1 mm")
    assert (mesh.surfaces(), mesh.regions()) == (("left",), ("product",))
    assert mesh.box() == (pytest.approx((0.0, 0.0)), pytest.approx((0.019, 0.019)))
    unread = MeshShape.model_construct(file="pop.msh", length_unit="1 mm")
    assert (unread.surfaces(), unread.regions()) == (None, None)
    assert mesh.length_unit == pytest.approx(1e-3)


@pytest.mark.parametrize("unit", ["mm", "1 mm", "inch"])
def test_the_unit_of_a_mesh_file_is_a_word_or_a_length(unit: str) -> None:
    assert MeshShape(file=SQUARE, length_unit=unit).length_unit == pytest.approx(
        0.0254 if unit == "inch" else 0.001
    )


def test_sections_and_boxes() -> None:
    assert {name: kind.section for name, kind in SHAPES.items()} == {
        "bar": "plane",
        "slab": "plane",
        "rod": "axisymmetric",
        "ring": "axisymmetric",
        "mesh": None,
    }
    assert np.allclose(Bar(**BAR).box(), [(-0.0118, -0.0258), (0.0118, 0.0258)])
    assert np.allclose(Rod(radius="14 mm", height="180 mm").box(), [(-0.014, 0.0), (0.014, 0.18)])


def test_a_cell_is_one_size_or_two_or_chosen() -> None:
    rod = {"radius": "14 mm", "height": "180 mm"}
    assert Rod(**rod).cells() == pytest.approx((0.014 / CELLS_ACROSS,) * 2)
    assert Rod(**rod, cell="1 mm").cells() == pytest.approx((1e-3, 1e-3))
    assert Rod(**rod, cell=["0.3 mm", "30 mm"]).cells() == pytest.approx((0.3e-3, 30e-3))


@pytest.mark.parametrize(
    ("kind", "given", "words"),
    [
        (Bar, {**BAR, "corner": "12 mm"}, r"corner.*22 mm / 2 = 11 mm.*got 12 mm"),
        (Bar, {**BAR, "corner": "-1 mm"}, r"at least 0.*got -1 mm"),
        (Bar, {**BAR, "wall": "0 mm"}, r"above 0.*got 0 mm"),
        (Bar, {**BAR, "thickness": "-22 mm"}, r"above 0.*got -22 mm"),
        (
            Ring,
            {"inner": "15 mm", "outer": "15 mm", "height": "1 cm"},
            r"smaller than outer \(15 mm\), got 15 mm",
        ),
        (Rod, {"radius": "14 mm", "height": "180 mm", "cell": "60 mm"}, r"28 mm across.*got 60 mm"),
        (
            Rod,
            {"radius": "14 mm", "height": "180 mm", "cell": ["1 mm", "200 mm"]},
            r"180 mm along.*got 200 mm",
        ),
        (Slab, {"thickness": "8 cm", "width": "8 cm", "cell": "1 um"}, r"cells; got 0.001 mm"),
        (Slab, {"thickness": "8 cm", "width": "1e-9 mm"}, r"cells"),
        (Slab, {"thickness": "8 cm", "width": "8 cm", "cell": ["1 mm"]}, r"one size or two"),
        (MeshShape, {"file": SQUARE, "length_unit": "kg"}, r"no unit of length|cannot be read"),
    ],
)
def test_impossible_dimensions_are_said_with_both_numbers(
    kind: type, given: dict[str, object], words: str
) -> None:
    with pytest.raises(ValidationError, match=words):
        kind(**given)
