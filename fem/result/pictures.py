"""The report's curves: temperatures, fronts and heat against time."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from fem.result.drawing import BLACK, GREY, LINES, PALE, label_of, stacked, svg_text
from fem.result.folder import Array

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_LINES = 6
MOST_POINTS = 1200


def curves(
    table: Mapping[str, Array], stages: Sequence[Mapping[str, Any]], aim: Mapping[str, Any] | None
) -> str:
    """Draw the temperatures against time, with a band for each stage and the aim.

    Parameters
    ----------
    table
        ``curves.csv``.
    stages, aim
        As in ``summary.json``.

    Returns
    -------
    SVG text.

    """
    slowest = table["slowest [degC]"]
    points = _named(table, "point.", " [degC]")
    alike = [name for name, values in points if _same(values, slowest)]
    points = [(name, values) for name, values in points if name not in alike]
    with stacked(1) as (figure, (ax,)):
        time, scale, unit = _clock(table["time [s]"])
        end = _bands(ax, stages, time, scale)
        first = f"slowest, the same as {alike[0]}" if alike else "slowest"
        lines = [(first, slowest, BLACK, "-", 2.0)]
        lines.append(("mean, once equalised", table["mean [degC]"], LINES[0], "--", 1.4))
        for (name, values), colour in zip(points[: MOST_LINES - 2], LINES[1:], strict=False):
            lines.append((name, values, colour, "-", 1.2))
        for name, values, colour, dash, width in lines:
            ax.plot(*_thinned(time, values), dash, color=colour, lw=width, label=label_of(name))
        if aim is not None:
            _aim(ax, aim, scale, end)
        ax.set_ylabel("temperature in °C")
        ax.set_xlabel(f"time in {unit}")
        _legend(ax)
        return svg_text(figure)


def fronts(table: Mapping[str, Array], stages: Sequence[Mapping[str, Any]]) -> str:
    """Draw how far the front has come along each ray, and how fast it goes; returns SVG text."""
    with stacked(2) as (figure, (where, speed)):
        time, scale, unit = _clock(table["time [s]"])
        for ax in (where, speed):
            _bands(ax, stages, time, scale, named=ax is where)
        rays = _named(table, "", ".position [mm]")[:MOST_LINES]
        top = 0.0
        for (name, position), colour in zip(rays, LINES, strict=False):
            where.plot(*_thinned(time, position), color=colour, label=label_of(name))
            v = table.get(f"{name}.speed [mm/min]")
            if v is not None and np.any(np.isfinite(v)):
                smooth = _running_mean(table["time [s]"], np.abs(v), smoothing(table["time [s]"]))
                speed.plot(*_thinned(time, smooth), color=colour)
                top = max(top, 2.0 * float(np.nanpercentile(smooth, 75)))
        where.set_ylabel("front in mm")
        where.set_ylim(bottom=0.0)
        # At both ends of a ray the speed has no bound: the picture shows what lies between.
        speed.set_ylim(0.0, top or 1.0)
        speed.set_ylabel("speed in mm/min")
        speed.set_xlabel(f"time in {unit}")
        _legend(where)
        return svg_text(figure)


def smoothing(seconds: Array) -> float:
    """Return over how long the speed of a front is averaged: a twentieth of the run [s].

    A front that has to free or to take up the latent heat of whole cells goes by fits and starts.
    """
    return float(seconds[-1] - seconds[0]) / 20.0


def heat(table: Mapping[str, Array], stages: Sequence[Mapping[str, Any]]) -> str:
    """Draw the heat load of each surface and the heat removed, per piece; returns SVG text."""
    with stacked(2) as (figure, (load, removed)):
        time, scale, unit = _clock(table["time [s]"])
        for ax in (load, removed):
            _bands(ax, stages, time, scale, named=ax is load)
        for (name, values), colour in zip(
            _named(table, "heat_load.", " [W]")[:MOST_LINES], LINES, strict=False
        ):
            load.plot(*_thinned(time, values), color=colour, label=label_of(name))
        load.set_ylabel("heat load in W")
        removed.plot(*_thinned(time, table["heat_removed [J]"] / 1e3), color=BLACK)
        removed.set_ylabel("removed in kJ")
        removed.set_xlabel(f"time in {unit}")
        _legend(load)
        return svg_text(figure)


def _clock(seconds: Array) -> tuple[Array, float, str]:
    """Return times in the unit that suits them, its length [s] and its name."""
    end = float(seconds[-1])
    scale, unit = (1.0, "s") if end < 120.0 else (60.0, "min") if end < 7200.0 else (3600.0, "h")
    return seconds / scale, scale, unit


def _bands(
    ax: Axes, stages: Sequence[Mapping[str, Any]], time: Array, scale: float, named: bool = True
) -> float:
    """Shade every second stage and name them; return the last time."""
    end = max(float(time[-1]), float(time[0]) + 1e-9)
    began = float(time[0])
    for number, stage in enumerate(stages):
        ended = min(max(float(stage["ended_s"]) / scale, began), end)
        if number % 2 == 0:
            ax.axvspan(began, ended, color=PALE, lw=0, zorder=0)
        wide = (ended - began) / (end - float(time[0]))
        name = label_of(stage["name"])
        if named and wide * 60 > len(name):
            place = ((began + ended) / 2, 1.01)
            ax.text(
                *place, name, transform=ax.get_xaxis_transform(), ha="center", va="bottom", color=GREY, size=7
            )
        began = ended
    ax.set_xlim(float(time[0]), end)
    return end


def _aim(ax: Axes, aim: Mapping[str, Any], scale: float, end: float) -> None:
    ax.axhline(aim["reach_degC"], color=GREY, lw=0.9, ls=(0, (5, 3)), zorder=1.5)
    said = f"aim {aim['reach_degC']:g} °C".replace("-", "−")
    ax.annotate(
        said,
        (0.0, aim["reach_degC"]),
        xycoords=ax.get_yaxis_transform(),
        xytext=(4, -3),
        textcoords="offset points",
        ha="left",
        va="top",
        color=GREY,
        size=7.5,
    )
    if aim["time_s"] is not None and aim["time_s"] / scale <= end * 1.001:
        ax.plot(
            aim["time_s"] / scale,
            aim["reach_degC"],
            "o",
            ms=6,
            mfc="white",
            mec=BLACK,
            mew=1.3,
            zorder=5,
            clip_on=False,
        )


def _legend(ax: Axes) -> None:
    handles, labels = ax.get_legend_handles_labels()
    if len(handles) > 3:
        ax.figure.legend(handles, labels, loc="outside upper center", ncols=3)
    elif handles:
        ax.legend(handles, labels, loc="best")


def _named(table: Mapping[str, Array], before: str, after: str) -> list[tuple[str, Array]]:
    """Return the columns whose names are framed so, by what stands between."""
    return [
        (name[len(before) : len(name) - len(after)], values)
        for name, values in table.items()
        if name.startswith(before) and name.endswith(after)
    ]


def _thinned(time: Array, values: Array) -> tuple[Array, Array]:
    every = max(1, int(np.ceil(len(time) / MOST_POINTS)))
    return time[::every], values[::every]


def _running_mean(seconds: Array, values: Array, window: float) -> Array:
    """Return the mean of what is known within half a window on either side, NaN where nothing is."""
    known = np.isfinite(values)
    total = np.concatenate([[0.0], np.cumsum(np.where(known, values, 0.0))])
    count = np.concatenate([[0], np.cumsum(known)])
    low = np.searchsorted(seconds, seconds - window / 2, "left")
    high = np.searchsorted(seconds, seconds + window / 2, "right")
    found = count[high] - count[low]
    return np.where(known, (total[high] - total[low]) / np.maximum(found, 1), np.nan)


def _same(a: Array, b: Array) -> bool:
    return bool(np.allclose(a, b, atol=0.2, equal_nan=True))
