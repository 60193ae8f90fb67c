"""The operating window drawn: a contour, curves with their band, or a ranking."""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from fem.curve import Array
from fem.result.drawing import BLACK, GREY, LINES, drawing, label_of, svg_text
from fem.series.weights import Weight
from fem.series.window import Dimension, Window

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

SIZE = (6.4, 4.2)
DOTS_PNG = 200
LIMIT = LINES[1]
PASS = "#00664b"
_LABELS = {"time_to_aim": "time to the aim", "slowest": "slowest point at the end"}
# Filled levels and lines of a contour.
_STEPS = (0.5, 1, 2, 2.5, 5, 10, 15, 20, 30, 60, 120, 240)
_WANTED = 12


def draw(
    window: Window,
    bands: Array | None,
    limited: Sequence[tuple[str, Array, float, bool]],
    weights: Sequence[Weight],
) -> tuple[bytes, str]:
    """Draw a window.

    Parameters
    ----------
    window
        What to draw.
    bands
        Low and high end of each result of a single curve [s], shape (2, x); None where not carried.
    limited
        Limits on other results of a contour: what it says, its grid, its level, whether it holds below.
    weights
        Of a ranking.

    Returns
    -------
    PNG, and SVG text for a page.

    """
    import matplotlib

    with drawing() as figure_of:
        matplotlib.rcParams["hatch.linewidth"] = 0.6
        height = SIZE[1] if window.kind != "ranking" else 1.1 + 0.42 * max(2, len(weights))
        figure = figure_of((SIZE[0], height))
        ax = figure.subplots()
        if window.kind == "contour":
            _contour(figure, ax, window, limited)
        elif window.kind == "curves":
            _curves(ax, window, bands)
        else:
            _ranking(ax, window, weights)
        out = io.BytesIO()
        figure.savefig(out, format="png", dpi=DOTS_PNG, metadata={"Software": None})
        return out.getvalue(), svg_text(figure)


def unit_of(window: Window, values: Array) -> tuple[float, str]:
    """Return the unit that results are drawn in: how many of theirs it has, and its name."""
    if window.result == "slowest":
        return 1.0, "°C"
    top = float(np.nanmax(values)) if np.any(np.isfinite(values)) else 0.0
    return (1.0, "s") if top < 120.0 else (60.0, "min") if top < 7200.0 else (3600.0, "h")


def _contour(
    figure: Figure, ax: Axes, window: Window, limited: Sequence[tuple[str, Array, float, bool]]
) -> None:
    from matplotlib.patheffects import withStroke

    x, y = window.x, window.y
    assert x is not None
    assert y is not None
    scale, unit = unit_of(window, window.grid)
    values = np.ma.masked_invalid(window.grid / scale)
    levels = _levels(float(values.min()), float(values.max()))
    ax.grid(visible=False)
    ax.set_facecolor("#e9e9e9")
    filled = ax.contourf(x.values, y.values, values, levels, cmap="viridis_r", extend="neither")
    bar = figure.colorbar(filled, ax=ax, pad=0.02, aspect=28)
    bar.set_label(f"{_LABELS[window.result]} in {unit}")
    bar.outline.set_linewidth(0.4)
    line = window.line / scale if window.line is not None else np.nan
    # The pass line is its own label.
    between = [level for level in levels[1:-1] if abs(level - line) > 1e-9 or np.isnan(line)]
    if between:
        lines = ax.contour(x.values, y.values, values, between, colors="white", linewidths=0.5)
        for text in ax.clabel(lines, fmt=_plain, fontsize=7, colors=BLACK):
            text.set_path_effects([withStroke(linewidth=1.8, foreground="white", alpha=0.75)])
    ax.plot(*np.meshgrid(x.values, y.values), ".", color=BLACK, ms=1.6, alpha=0.35, zorder=2.5)
    handles = []
    if window.line is not None:
        handles += _pass_line(ax, window, values, scale, unit)
    handles += [_limit_line(ax, window, *limit) for limit in limited]
    handles += [h for dimension, along in ((x, True), (y, False)) for h in _walls(ax, dimension, along)]
    if x.base is not None and y.base is not None and _inside(x) and _inside(y):
        handles += ax.plot(
            x.base, y.base, "o", ms=8, mfc="white", mec=BLACK, mew=1.4, zorder=6, label="the base"
        )
    if values.mask.any():
        from matplotlib.patches import Patch

        handles.append(Patch(fc="#e9e9e9", ec=GREY, lw=0.4, label="not reached"))
    _axes(ax, x, y)
    if handles:
        long = sum(len(str(handle.get_label())) for handle in handles) > 60
        figure.legend(handles=handles, loc="outside upper left", ncols=2 if long else 4)


def _pass_line(ax: Axes, window: Window, values: Any, scale: float, unit: str) -> list[Any]:
    """Draw where the line is met, thick, and veil what does not pass."""
    from matplotlib.lines import Line2D

    x, y = window.x, window.y
    assert x is not None
    assert y is not None
    assert window.line is not None
    level = window.line / scale
    low, high = float(values.min()), float(values.max())
    if window.below and high > level:
        ax.contourf(x.values, y.values, values, [max(level, low), high + 1.0], colors=["white"], alpha=0.45)
    elif not window.below and low < level:
        ax.contourf(x.values, y.values, values, [low - 1.0, min(level, high)], colors=["white"], alpha=0.45)
    said = f"pass line, {_plain(level)} {unit}"
    if not low < level < high:
        return [
            Line2D([], [], lw=0, label=f"{said}: {'all' if (level >= high) == window.below else 'none'} pass")
        ]
    ax.contour(x.values, y.values, values, [level], colors=[BLACK], linewidths=2.4, zorder=3)
    return [Line2D([], [], color=BLACK, lw=2.4, label=said)]


def _limit_line(ax: Axes, window: Window, said: str, grid: Array, level: float, below: bool) -> Any:
    from matplotlib.lines import Line2D

    x, y = window.x, window.y
    assert x is not None
    assert y is not None
    values = np.ma.masked_invalid(grid)
    low, high = float(values.min()), float(values.max())
    if low < level < high:
        outside = [level, high + abs(high) + 1.0] if below else [low - abs(low) - 1.0, level]
        hatched = ax.contourf(x.values, y.values, values, outside, colors="none", hatches=["///"], zorder=2)
        hatched.set_edgecolor(LIMIT)
        hatched.set_linewidth(0.0)
        ax.contour(
            x.values, y.values, values, [level], colors=[LIMIT], linewidths=1.6, linestyles="--", zorder=3
        )
    return Line2D([], [], color=LIMIT, lw=1.6, ls="--", label=_typed(f"limit: {said}"))


def _walls(ax: Axes, dimension: Dimension, along_x: bool) -> list[Any]:
    """Draw the limits on what varies itself as lines, hatched beyond; return one handle of them."""
    ends = (dimension.values[0], dimension.values[-1])
    handles = []
    for limit, beyond, word in zip(dimension.limits, ends, ("least", "most"), strict=True):
        if not ends[0] < limit < ends[1]:
            continue
        line, span = (ax.axvline, ax.axvspan) if along_x else (ax.axhline, ax.axhspan)
        said = f"limit: {dimension.name} at {word} {dimension.said(limit)}"
        handles.append(line(limit, color=LIMIT, lw=1.6, ls="--", zorder=3, label=_typed(said)))
        span(min(limit, beyond), max(limit, beyond), fc="none", ec=LIMIT, lw=0, hatch="///", zorder=2)
    return handles


def _curves(ax: Axes, window: Window, bands: Array | None) -> None:
    x, names = window.x, window.y.values if window.y is not None else [""]
    assert x is not None
    scale, unit = unit_of(window, window.grid if bands is None else np.vstack([window.grid, bands]))
    if bands is not None:
        low, high = bands / scale
        ax.fill_between(x.values, low, high, color=LINES[0], alpha=0.16, lw=0, label="19 times out of 20")
    for name, values, colour in zip(names, window.grid / scale, LINES, strict=False):
        ax.plot(x.values, values, "o-", color=colour, ms=3.5, lw=1.7, label=label_of(name) if name else None)
    if window.line is not None:
        level = window.line / scale
        ax.axhline(level, color=BLACK, lw=1.6, ls=(0, (6, 2)), zorder=1.5)
        ax.annotate(
            _typed(f"pass line, {_plain(level)} {unit}"), (1.0, level), xycoords=ax.get_yaxis_transform(),
            xytext=(-3, 3), textcoords="offset points", ha="right", va="bottom", fontsize=7.5,
        )  # fmt: skip
    _walls(ax, x, along_x=True)
    if x.base is not None and _inside(x):
        ax.axvline(x.base, color=GREY, lw=0.8, ls=":", zorder=1.2)
        ax.annotate(
            "the base", (x.base, 1.0), xycoords=ax.get_xaxis_transform(), xytext=(3, -2),
            textcoords="offset points", ha="left", va="top", color=GREY, fontsize=7.5,
        )  # fmt: skip
    _axes(ax, x, None)
    ax.set_ylabel(f"{_LABELS[window.result]} in {unit}")
    if window.result == "time_to_aim":
        ax.set_ylim(bottom=0.0)
    if ax.get_legend_handles_labels()[1]:
        ax.figure.legend(loc="outside upper left", ncols=4)


def _ranking(ax: Axes, window: Window, weights: Sequence[Weight]) -> None:
    """Draw how far the mean result moves with each thing that varies."""
    swings = np.array([w.swing for w in weights]) if len(weights) else np.zeros(1)
    # What is a difference has no offset: it is scaled like the results themselves.
    scale, unit = unit_of(window, swings) if window.result != "slowest" else (1.0, "K")
    for row, weight in enumerate(weights):
        ax.barh(row, weight.swing / scale, color=LINES[0], height=0.6)
        told = f"{_plain(round(weight.swing / scale, 2))} {unit}, {100 * weight.share:.0f} %"
        place = (weight.swing / scale, row)
        ax.annotate(told, place, xytext=(4, 0), textcoords="offset points", va="center", fontsize=7.5)
    ax.set_yticks(range(len(weights)), [label_of(w.name) for w in weights])
    ax.invert_yaxis()
    ax.set_axisbelow(True)
    ax.grid(visible=False, axis="y")
    ax.set_xlim(0.0, 1.25 * float(swings.max()) / scale or 1.0)
    what = _LABELS[window.result]
    ax.set_xlabel(f"how far the mean {what} moves, in {unit}, and its share of all that varies")


def _axes(ax: Axes, x: Dimension, y: Dimension | None) -> None:
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    for dimension, axis in ((x, ax.xaxis), (y, ax.yaxis)):
        if dimension is None:
            continue
        unit = f" in {_typed(dimension.unit)}" if dimension.unit else ""
        axis.set_label_text(label_of(dimension.name) + unit)
        if dimension.log:
            (ax.set_xscale if dimension is x else ax.set_yscale)("log")
            axis.set_major_locator(LogLocator(subs=(1.0, 1.5, 2.0, 3.0, 4.0, 6.0, 8.0)))
            axis.set_minor_formatter(NullFormatter())
        axis.set_major_formatter(FuncFormatter(lambda value, _: _plain(value)))
    ax.set_xlim(x.values[0], x.values[-1])
    if y is not None:
        ax.set_ylim(y.values[0], y.values[-1])


def _levels(low: float, high: float) -> Array:
    step = next((s for s in _STEPS if (high - low) / s <= _WANTED), None) or (high - low) / _WANTED
    first, last = np.floor(low / step), np.ceil(high / step)
    return step * np.arange(first, max(last, first + 1) + 1)


def _inside(dimension: Dimension) -> bool:
    return dimension.base is not None and dimension.values[0] <= dimension.base <= dimension.values[-1]


def _plain(value: float) -> str:
    return f"{value:.4g}".replace("-", "\N{MINUS SIGN}")


def _typed(text: str) -> str:
    text = text.replace("degC", "°C").replace("W/m2/K", "W/m²K")
    return text.replace(" -", " \N{MINUS SIGN}")
