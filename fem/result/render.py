"""Draws fields with pyvista; run by `fem.result.view` as a process of its own, which may crash."""

from __future__ import annotations

import errno
import json
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pyvista as pv

from fem.errors import CaseError
from fem.result.frames import FieldSeries, check_array, names, open_fields
from fem.result.view import DRAWING, REFUSED

LONG_SIDE, LEAST, BESIDE, ABOVE, BELOW, SLIDER = 800, 420, 40, 60, 150, 50
"""Pixels of a picture: the section's longer side, its least room, and what stands around it."""

LABELS = {
    "temperature_degC": "temperature [degC]",
    "ice": "ice [share of mass]",
    "enthalpy_J_per_kg": "enthalpy [J/kg]",
    "frozen_at_s": "frozen at [s]",
    "local_freezing_time_s": "local freezing time [s]",
    "region": "region",
}
# Each rises evenly in lightness and reads the same to any kind of colour vision, as in the report.
PALETTES: dict[str, Any] = {"temperature_degC": "cividis", "ice": "Blues"}
OTHER = "viridis"
GREY = "#d0d0d0"


def main(asked: str) -> int:
    """Draw what is asked for as JSON; say on standard output, as JSON too, what is refused."""
    wish = json.loads(asked)
    try:
        series = open_fields(Path(wish["folder"]))
        number = series.nearest(wish["time"])
        check_array(series.read(number), wish["array"], series.times[number])
        print(DRAWING, flush=True)
        if wish["out"]:
            _picture(series, number, wish["array"], Path(wish["out"]))
        else:
            _window(series, number, wish["array"])
    except CaseError as error:
        problems = [{"place": p.place, "message": p.message} for p in error.problems]
        print(json.dumps({"source": error.source, "problems": problems}))
        return REFUSED
    except OSError as error:
        print(json.dumps({"errno": error.errno or errno.EIO, "filename": error.filename or wish["out"]}))
        return REFUSED
    return 0


def _picture(series: FieldSeries, number: int, array: str, out: Path) -> None:
    from PIL import Image

    plotter, _ = _scene(series, number, array, ABOVE, off_screen=True)
    image = plotter.screenshot(return_img=True)
    plotter.close()
    Image.fromarray(np.asarray(image)).save(out, format="PNG")


def _window(series: FieldSeries, number: int, array: str) -> None:
    """Show a frame and a slider that goes to the others."""
    plotter, grid = _scene(series, number, array, ABOVE + SLIDER, off_screen=False)
    holding = [i for i in range(len(series.times)) if array in names(series.read(i))]

    def move(time: float) -> None:
        i = min(holding, key=lambda i: abs(series.times[i] - time))
        grid[array] = series.read(i)[array]
        plotter.add_text(_clock(series.times[i]), name="clock", font_size=12, color="black")

    if len(holding) > 1:
        bounds = [series.times[holding[0]], series.times[holding[-1]]]
        height = 1.0 - 85.0 / plotter.window_size[1]
        plotter.add_slider_widget(
            move,
            bounds,
            value=series.times[number],
            pointa=(0.1, height),
            pointb=(0.9, height),
            fmt="%.0f",
            color="black",
            tube_width=0.003,
            slider_width=0.015,
        )
    plotter.show()


def _scene(series: FieldSeries, number: int, array: str, above: int, off_screen: bool) -> tuple[Any, Any]:
    """Put a frame on a stage, seen from in front; return the plotter and the grid it shows."""
    grid = series.read(number)
    low, high = grid.points.min(axis=0)[:2], grid.points.max(axis=0)[:2]
    scale = LONG_SIDE / float(np.max(high - low))
    room = np.maximum(scale * (high - low), LEAST)
    size = [int(room[0]) + 2 * BESIDE, int(room[1]) + above + BELOW]
    # Typed loosely: what decorates pyvista's methods hides their arguments from the checker.
    plotter: Any = pv.Plotter(off_screen=off_screen, window_size=size)
    plotter.set_background("white")
    plotter.add_mesh(
        grid,
        scalars=array,
        cmap=PALETTES.get(array, OTHER),
        clim=_limits(series, array),
        nan_color=GREY,
        lighting=False,
        scalar_bar_args={
            "title": LABELS.get(array, array),
            "color": "black",
            "title_font_size": 22,
            "label_font_size": 18,
            "fmt": "{:.4g}",
            "position_x": 0.1,
            "position_y": 15.0 / size[1],
            "width": 0.8,
            "height": 125.0 / size[1],
            "n_labels": 5,
        },
    )
    regions = np.asarray(grid.cell_data["region"])
    for region in np.unique(regions):
        part = grid.extract_cells(regions == region)
        edges = part.extract_surface(algorithm="dataset_surface").extract_feature_edges(
            boundary_edges=True, feature_edges=False, manifold_edges=False, non_manifold_edges=False
        )
        plotter.add_mesh(edges, color="black", line_width=1.5, show_scalar_bar=False)
    plotter.add_text(_clock(series.times[number]), name="clock", font_size=12, color="black")
    plotter.view_xy()
    plotter.enable_parallel_projection()
    x, y = (low + high) / 2.0
    y -= 0.5 * (BELOW - above) / scale
    plotter.camera.focal_point, plotter.camera.position = (x, y, 0.0), (x, y, 1.0)
    plotter.camera.parallel_scale = 0.5 * size[1] / scale
    return plotter, grid


def _limits(series: FieldSeries, array: str) -> tuple[float, float]:
    """Return the lowest and highest value over all frames, so that pictures can be compared."""
    low, high = np.inf, -np.inf
    for i in range(len(series.times)):
        grid = series.read(i)
        if array in names(grid):
            values = np.asarray(grid[array], dtype=float)
            known = values[np.isfinite(values)]
            if len(known):
                low, high = min(low, float(known.min())), max(high, float(known.max()))
    return (low, high) if low <= high else (0.0, 1.0)


def _clock(time: float) -> str:
    return f"{time:.4g} s" if time < 120.0 else f"{time:.0f} s = {time / 60.0:.3g} min"


if __name__ == "__main__":
    sys.exit(main(sys.argv[1]))
