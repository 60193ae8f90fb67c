"""The case that comes as a mesh file, against round bars that need none."""

from __future__ import annotations

import importlib.util
from functools import cache
from pathlib import Path
from types import ModuleType

import meshio
import numpy as np
import pytest

from fem.case.read import load, loads
from fem.run import run
from tests.conftest import CASES

MESHES = CASES.parent / "meshes"


def maker() -> ModuleType:
    spec = importlib.util.spec_from_file_location("make_fluted_bar", MESHES / "make_fluted_bar.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@cache
def outline_length_and_area() -> tuple[float, float]:
    """Perimeter [mm] and area [mm2] of the product's outline, by counting."""
    (x, y), _ = maker().outline(np.linspace(0.0, 2.0 * np.pi, 100_001))
    area = 0.5 * np.sum(x[:-1] * y[1:] - x[1:] * y[:-1])
    return float(np.hypot(np.diff(x), np.diff(y)).sum()), float(area)


def time_of_round_bar(diameter: float) -> float:
    """Time to -12 degC of a round bar in the same wall and coolant [s]."""
    text = (CASES / "fluted_bar.toml").read_text(encoding="utf-8")
    size = f'thickness = "{diameter} mm"\nwidth = "{diameter} mm"\ncorner = "{0.49999 * diameter} mm"\n'
    form = f'[shape]\nform = "bar"\n{size}wall = "0.8 mm"\n\n'
    before, after = text.split("[shape]")[0], text[text.index("[regions]") :]
    after = after.split("[watch.rays]")[0] + after[after.index("[aim]") :]
    return float(run(loads(before + form + after)).summary["aim"]["time_s"])


def test_the_file_is_what_its_maker_makes(tmp_path: Path) -> None:
    maker().section().write(tmp_path / "again.msh", file_format="gmsh22", binary=False, float_fmt=".6f")
    again, kept = (meshio.gmsh.read(p) for p in (tmp_path / "again.msh", MESHES / "fluted_bar.msh"))
    np.testing.assert_allclose(again.points, kept.points, atol=2e-6)
    for one, two in zip(again.cells, kept.cells, strict=True):
        np.testing.assert_array_equal(one.data, two.data)


def test_a_fluted_bar_freezes_between_the_round_bars_that_bracket_it() -> None:
    around, area = outline_length_and_area()
    summary = run(load(CASES / "fluted_bar.toml")).summary
    # Through the film heat leaves by surface, so that volume over surface is what counts; inside,
    # of all sections of one area the round one is the slowest. The truth lies between the two.
    fast, slow = time_of_round_bar(4.0 * area / around), time_of_round_bar(2.0 * np.sqrt(area / np.pi))
    assert fast < summary["aim"]["time_s"] < slow
    assert (fast, slow) == pytest.approx((828.0, 934.0), rel=5e-3)
    assert summary["aim"]["time_s"] == pytest.approx(881.0, rel=0.06)
    # Chords inside the outline leave out 0.2 % of it.
    assert summary["mass_kg"]["product"] == pytest.approx(1075.0 * 0.1 * area * 1e-6, rel=2.5e-3)
    assert summary["slowest"]["at_m"] == pytest.approx([0.0, 0.0], abs=1e-9)
