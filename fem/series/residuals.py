"""The residuals of a fit, to look at and to count with."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from fem.result.drawing import GREY, LINES, drawing, label_of

if TYPE_CHECKING:
    from fem.series.fitted import Trace

SIZE = (6.4, 6.0)


def table(traces: Sequence[Trace]) -> str:
    """Return all residuals as CSV."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(
        [
            "log",
            "point",
            "temperature [degC]",
            "time of the case [s]",
            "residual [s]",
            "standard deviation [s]",
        ]
    )
    for trace in traces:
        columns = (trace.temperatures, trace.times, trace.residuals, trace.sigma)
        for row in zip(*columns, strict=True):
            writer.writerow([trace.log.name, trace.at, *(f"{value:.6g}" for value in row)])
    return out.getvalue()


def draw(traces: Sequence[Trace], path: Path) -> None:
    """Draw the logs with the fitted case's times above, the residuals below.

    Parameters
    ----------
    traces
        Each log beside the fitted case.
    path
        PNG file to write.

    """
    with drawing() as figure_of:
        figure = figure_of(SIZE)
        above, below = figure.subplots(2, 1, height_ratios=(3, 2))
        for trace, colour in zip(traces, LINES * len(traces), strict=False):
            minutes = (trace.log.times - trace.pour) / 60.0
            above.plot(minutes, trace.log.temperatures, ".", ms=1.5, color=GREY, zorder=1)
            label = label_of(f"{trace.log.name}, {trace.at}")
            above.plot(
                trace.times / 60.0, trace.temperatures, "o", ms=4, mfc="none", color=colour, label=label
            )
            below.errorbar(
                trace.temperatures, trace.residuals, 2.0 * trace.sigma, fmt="o", ms=3.5, lw=0.8, color=colour
            )
        last = max(float(trace.times.max()) for trace in traces) / 60.0
        above.set_xlim(-0.1 * last, 1.2 * last)
        above.set_xlabel("time since the pour in min")
        above.set_ylabel("temperature in °C")
        above.legend(title="fitted case; grey: the log")
        below.axhline(0.0, color=GREY, lw=0.8)
        below.invert_xaxis()
        below.set_xlabel("temperature in °C")
        below.set_ylabel("time of the case less the log's, in s")
        figure.savefig(path, format="png")
