"""Curves of several runs in one picture, and their times as bars."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np

from fem.result.drawing import GREY, HEIGHT, LINES, WIDTH, drawing, label_of, svg_text
from fem.result.folder import Array

DASHES = ("-", "--", ":", "-.")
MOST_POINTS = 1200


def temperatures(
    runs: Sequence[tuple[str, Mapping[str, Array]]],
    column: str,
    label: str,
    level: float | None,
    png: Path | None = None,
) -> str:
    """Draw a column of the curves of several runs against time.

    Parameters
    ----------
    runs
        Name and ``curves.csv`` of each.
    column
        Its heading.
    label
        What the axis says.
    level
        Where a dashed line is drawn; None for none.
    png
        File to write a picture to as well.

    Returns
    -------
    SVG text.

    """
    known = [(name, curves["time [s]"], curves[column]) for name, curves in runs if column in curves]
    end = max((float(time[-1]) for _, time, _ in known), default=1.0)
    scale, unit = (1.0, "s") if end < 120.0 else (60.0, "min") if end < 7200.0 else (3600.0, "h")
    with drawing() as figure_of:
        figure = figure_of((WIDTH, HEIGHT))
        ax = figure.subplots()
        for n, (name, time, values) in enumerate(known):
            every = max(1, len(time) // MOST_POINTS)
            dash = DASHES[n // len(LINES) % len(DASHES)]
            colour = LINES[n % len(LINES)]
            ax.plot(time[::every] / scale, values[::every], dash, color=colour, label=label_of(name))
        if level is not None:
            ax.axhline(level, color=GREY, lw=0.9, ls=(0, (5, 3)), zorder=1.5)
        ax.set_xlim(0.0, end / scale)
        ax.set_xlabel(f"time in {unit}")
        ax.set_ylabel(label)
        if known:
            figure.legend(loc="outside upper center", ncols=3)
        if png is not None:
            figure.savefig(png, format="png")
        return svg_text(figure)


def end_bars(times: Sequence[tuple[str, float | None, tuple[float, float] | None]]) -> str:
    """Draw the time to the aim of each run with its likely range; returns SVG text."""
    longest = max([t for _, t, _ in times if t is not None], default=1.0)
    scale, unit = (1.0, "s") if longest < 120.0 else (60.0, "min") if longest < 7200.0 else (3600.0, "h")
    with drawing() as figure_of:
        figure = figure_of((WIDTH, max(HEIGHT, 0.8 + 0.28 * len(times))))
        ax = figure.subplots()
        for n, (_, time, likely) in enumerate(times):
            if time is None:
                ax.text(0.0, n, " not reached", va="center", color=GREY)
                continue
            ax.barh(n, time / scale, height=0.6, color=LINES[n % len(LINES)])
            if likely is not None:
                error = np.maximum(np.array([[time - likely[0]], [likely[1] - time]]), 0.0) / scale
                ax.errorbar(time / scale, n, xerr=error, color="black", lw=1.0, capsize=3)
        ax.set_yticks(range(len(times)), [label_of(name) for name, _, _ in times])
        ax.invert_yaxis()
        ax.set_xlim(left=0.0)
        ax.set_xlabel(f"time to the aim in {unit}, with its likely range")
        ax.grid(visible=False, axis="y")
        return svg_text(figure)
