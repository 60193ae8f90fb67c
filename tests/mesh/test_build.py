from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fem.mesh import build as module
from fem.mesh.build import build
from fem.mesh.shape import Bar
from tests.pieces import bar, ring, rod, slab


def test_slab_surfaces_lie_where_their_names_say() -> None:
    domain = build(slab(), 0.1)
    for name, axis, value in (("left", 0, 0.0), ("right", 0, 0.02), ("bottom", 1, 0.0), ("top", 1, 0.004)):
        places = domain.points[axis, domain.mesh.facets[:, domain.surfaces[name]]]
        np.testing.assert_allclose(places, value, atol=1e-15)


def test_every_outer_facet_of_a_slab_has_exactly_one_name() -> None:
    domain = build(slab(), 0.1)
    named = np.sort(np.concatenate(list(domain.surfaces.values())))
    np.testing.assert_array_equal(named, np.sort(domain.mesh.boundary_facets()))


def test_a_rod_has_no_surface_on_its_axis() -> None:
    domain = build(rod(), None)
    unnamed = np.setdiff1d(domain.mesh.boundary_facets(), np.concatenate(list(domain.surfaces.values())))
    np.testing.assert_allclose(domain.points[0, domain.mesh.facets[:, unnamed]], 0.0, atol=1e-15)


@pytest.mark.parametrize(
    ("shape", "surface", "area"),
    [
        (rod(), "side", 2 * np.pi * 0.014 * 0.02),
        (rod(), "top", np.pi * 0.014**2),
        (ring(), "inside", 2 * np.pi * 0.004 * 0.02),
        (ring(), "bottom", np.pi * (0.014**2 - 0.004**2)),
    ],
)
def test_areas_of_revolution_are_exact(shape, surface: str, area: float) -> None:
    domain = build(shape, None)
    assert domain.edge_areas(surface).sum() == pytest.approx(area, rel=1e-12)


def test_a_quarter_bar_reports_the_whole_outline() -> None:
    domain = build(bar(wall=None, cell="0.5 mm"), 0.083)
    outline = 2 * (22e-3 - 12e-3) + 2 * (50e-3 - 12e-3) + 2 * np.pi * 6e-3
    # Chords that enclose the area of an arc differ from its length by the square of their angle.
    assert domain.edge_areas("outside").sum() == pytest.approx(outline * 0.083, rel=2e-4)


@pytest.mark.parametrize("cell", ["2 mm", "0.5 mm"])
def test_chords_enclose_the_area_of_the_corner(cell: str) -> None:
    shape = bar(cell=cell)
    areas = build(shape, 0.083).areas
    for region, area in shape.areas().items():
        assert areas[region] == pytest.approx(area, rel=1e-12)


def test_a_wrong_area_is_not_let_through(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(module, "_swell", np.ones_like)
    with pytest.raises(AssertionError, match="meshed area of product"):
        build(bar(), 0.083)


@settings(max_examples=40, deadline=None)
@given(
    thickness=st.floats(8, 40),
    ratio=st.floats(1, 4),
    corner=st.floats(0, 1),
    wall=st.one_of(st.none(), st.floats(0.3, 4)),
    turned=st.booleans(),
)
def test_any_bar_gives_sound_cells(
    thickness: float, ratio: float, corner: float, wall: float | None, turned: bool
) -> None:
    sides = sorted([thickness, thickness * ratio], reverse=turned)
    keys = {
        "thickness": f"{sides[0]} mm",
        "width": f"{sides[1]} mm",
        "corner": f"{corner * min(sides) / 2 * 0.999} mm",
        "cell": f"{min(sides) / 16} mm",
    }
    shape = Bar.model_validate(keys | ({"wall": f"{wall} mm"} if wall else {}))
    domain = build(shape, 0.1)  # asserts the area itself
    assert domain.quality > 0.3
    assert len(np.unique(domain.mesh.t)) == domain.points.shape[1]
    low, high = domain.bounds
    extent = np.array(sides) * 1e-3 + (2e-3 * wall if wall else 0.0)
    np.testing.assert_allclose(high - low, extent, rtol=1e-12)


def test_points_of_the_whole_piece_fold_into_the_quarter() -> None:
    domain = build(bar(), 0.083)
    folded = domain.fold(np.array([[-3e-3, 3e-3], [2e-3, -2e-3]]))
    np.testing.assert_array_equal(folded, [[3e-3, 3e-3], [2e-3, 2e-3]])
