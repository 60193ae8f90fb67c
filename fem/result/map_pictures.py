"""The report's maps: one field over the section, the slowest point marked."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from fem.result.drawing import BLACK, WIDTH, drawing, svg_text
from fem.result.folder import Array
from fem.result.maps import Frame

if TYPE_CHECKING:
    from matplotlib.axes import Axes


@dataclass(frozen=True)
class Colours:
    """What the colours of a map stand for.

    Parameters
    ----------
    limits
        Lowest and highest value.
    palette
        Its name; one that rises evenly in lightness.
    label
        Quantity and unit.

    """

    limits: tuple[float, float]
    palette: str
    label: str


def colour_map(
    frame: Frame,
    values: Array,
    shown: NDArray[np.bool_],
    colours: Colours,
    slowest: tuple[float, float],
    axes: tuple[str, str],
) -> str:
    """Draw one field over the section, the slowest point marked.

    Parameters
    ----------
    frame
        The mesh.
    values
        One per node, NaN where there is none, shape (nodes,).
    shown
        Which triangles to colour, shape (triangles,).
    colours
        What they stand for.
    slowest
        Where the slowest point lies [mm].
    axes
        Names of the coordinates.

    Returns
    -------
    SVG text; the coloured area is a picture inside it, so that a fine mesh costs no more.

    """
    from matplotlib.tri import Triangulation

    points = 1e3 * frame.points
    with drawing() as figure_of:
        size = _map_size(frame)
        figure = figure_of(size)
        ax = figure.add_subplot()
        ax.grid(False)
        known = np.isfinite(values[frame.triangles]).all(axis=1)
        if np.any(bare := ~(shown & known)):
            grid = Triangulation(points[:, 0], points[:, 1], frame.triangles[bare])
            ax.tripcolor(grid, facecolors=np.zeros(int(bare.sum())), cmap=_plain(), rasterized=True, zorder=0)
        if np.any(drawn := shown & known):
            grid = Triangulation(points[:, 0], points[:, 1], frame.triangles[drawn])
            low, high = colours.limits
            filled = np.where(np.isfinite(values), values, low)
            look: dict[str, Any] = {"cmap": colours.palette, "vmin": low, "vmax": high, "rasterized": True}
            art = ax.tripcolor(grid, filled, shading="gouraud", **look)
            thick = max(0.05, 0.11 / size[1])
            bar = figure.colorbar(art, ax=ax, orientation="horizontal", fraction=thick, pad=0.02, aspect=24)
            bar.outline.set_visible(False)
            bar.set_label(colours.label)
            bar.ax.tick_params(length=2)
        _outline(ax, points, frame.outline)
        _mark(ax, slowest)
        ax.set_aspect("equal")
        ax.set_xlabel(f"{axes[0]} in mm")
        ax.set_ylabel(f"{axes[1]} in mm")
        _ticks(ax, points)
        return svg_text(figure)


def is_wide(frame: Frame) -> bool:
    """Return whether a section lies on its side, so that its map takes half a page's width."""
    across, along = np.ptp(frame.points, axis=0)
    return bool(across > 1.2 * along)


def _map_size(frame: Frame) -> tuple[float, float]:
    if not is_wide(frame):
        return 2.3, 3.3
    across, along = np.ptp(frame.points, axis=0)
    return WIDTH, float(np.clip(1.0 + WIDTH * along / across, 1.3, 3.3))


def nice_limits(values: Array, step: float, floor: float | None = None) -> tuple[float, float]:
    """Return limits that are whole steps, so that runs alike get the same ones.

    >>> nice_limits(np.array([-19.5, -12.0]), 10.0)
    (-20.0, -10.0)
    """
    known = values[np.isfinite(values)]
    if not len(known):
        return 0.0, step
    low = float(np.floor(known.min() / step) * step) if floor is None else floor
    high = float(np.ceil(known.max() / step) * step)
    return low, max(high, low + step)


def _mark(ax: Axes, place: tuple[float, float]) -> None:
    """Mark a place so that it is seen on light and on dark."""
    for colour, width in (("white", 2.6), (BLACK, 1.2)):
        ax.plot(*place, "o", ms=9, mfc="none", mec=colour, mew=width, zorder=5, clip_on=False)
    ax.plot(*place, "+", ms=6, color=BLACK, mew=1.0, zorder=6, clip_on=False)


def _plain() -> Any:
    from matplotlib.colors import ListedColormap

    return ListedColormap(["#d9d9d9"])


def _ticks(ax: Axes, points: Array) -> None:
    """Give the longer side five ticks or so, and a side too short for that its ends."""
    from matplotlib.ticker import MaxNLocator

    low, span = points.min(axis=0), np.ptp(points, axis=0)
    for axis, at, wide in zip((ax.xaxis, ax.yaxis), low, span, strict=True):
        if wide < 0.25 * span.max():
            axis.set_ticks([at, at + wide], [f"{v:.3g}".replace("-", "−") for v in (at, at + wide)])
        else:
            axis.set_major_locator(MaxNLocator(5))


def _outline(ax: Axes, points: Array, edges: NDArray[np.int64]) -> None:
    from matplotlib.collections import LineCollection

    ax.add_collection(
        LineCollection(list(points[edges]), colors=BLACK, linewidths=0.6, rasterized=True, zorder=4)
    )
