"""Meshes of one piece, each twice as fine as the one before."""

from __future__ import annotations

from math import ceil

from fem.mesh.shape import Bar, Ring, Rod, Slab


def coarse_cells(shape: Slab | Rod | Ring | Bar) -> tuple[float, float]:
    """Return cell sizes of about twice those of a shape, which halve without a remainder [m].

    Of a rectangle as many whole rows as half of its own, rounded; of a bar as many whole rows in
    the band along its outline. Halving them then doubles the rows exactly, so that meshes of
    one shape compare as members of one family.
    """
    cells = shape.cells()
    if isinstance(shape, Bar):
        band = shape.smallest / 4.0
        across = band / max(1, round(_rows(band, cells[0]) / 2))
        return across, across
    (left, low), (right, high) = shape.box()
    across, along = right - left, high - low
    if isinstance(shape, Rod):
        across = shape.radius
    elif isinstance(shape, Ring):
        across = shape.outer - shape.inner
    first, second = (
        extent / max(1, round(_rows(extent, cell) / 2))
        for extent, cell in zip((across, along), cells, strict=True)
    )
    return first, second


def _rows(extent: float, cell: float) -> int:
    return max(1, ceil(extent / cell - 1e-9))
