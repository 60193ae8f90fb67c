"""The page of a sweep, the answer first, and its picture beside it."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from fem.curve import Array
from fem.result.answer import duration
from fem.result.disk import replace
from fem.result.page import render
from fem.series.sweep_plan import SweepPlan
from fem.series.table import Heads, Row, known
from fem.series.variations import RESULTS
from fem.series.weights import Weight, weights_of
from fem.series.window import Window, pass_at_base, passes_of, window_of
from fem.series.window_answer import answer, setting
from fem.series.window_pictures import draw

PAGE, PICTURE, TEMPLATE = "report.html", "window.png", "sweep.html.j2"
MOST_ROWS = 20
_DIGITS = {"time_to_aim": 0, "slowest": 1, "mean": 1, "heat_removed": 2, "ice_mean": 0}
_SIGNS = {"time_to_aim": (1.0, "s"), "slowest": (1.0, "degC"), "mean": (1.0, "degC"),
          "heat_removed": (1e-3, "kJ"), "ice_mean": (100.0, "%")}  # fmt: skip


def write_page(plan: SweepPlan, rows: list[Row], summary: dict[str, Any], root: Path) -> str:
    """Write ``report.html`` and ``window.png`` into the folder of a sweep.

    Parameters
    ----------
    plan, rows
        What was asked, and what came of it.
    summary
        As in ``sweep.json``, its answer still to be found.
    root
        The folder.

    Returns
    -------
    The answer.

    """
    heads = Heads(plan)
    window = window_of(plan, rows)
    said = answer(plan, rows, window)
    weights = weights_of(plan, rows, window.result)
    figure = None
    if known(rows, heads.results[window.result]) and (window.kind != "ranking" or weights):
        png, svg = draw(window, _bands(window, rows), _limited(plan, window, rows), weights)
        (root / (PICTURE + ".part")).write_bytes(png)
        (root / (PICTURE + ".part")).replace(root / PICTURE)
        figure = {"svg": svg, "alt": said, **_caption(window, plan)}
    else:
        (root / PICTURE).unlink(missing_ok=True)
    content = {
        "title": plan.title.strip() or "A sweep",
        "answer": said,
        "verdict": _verdict(rows),
        "tiles": _tiles(plan, rows, summary),
        "figure": figure,
        "edges": _edges(window),
        "edge_heads": (window.y.name if window.y else "", window.x.name if window.x else ""),
        "limits": [_limit(name, ends, plan) for name, ends in plan.limits.items()],
        "weights": [_weight(w, window) for w in weights] if window.kind == "ranking" else [],
        "best": _best(plan, rows, window),
        "best_heads": [*heads.varied, "time to aim s", "slowest °C", "equalised °C", "heat kJ", "ice %"],
        "failed": [
            (_settings(plan, heads, row), row["reason"]) for row in rows if row["outcome"] != "finished"
        ],
        "rows": len(rows),
        "program": summary["program"],
        "plan_text": plan.text,
        "base": Path(plan.base.source).name,
    }
    replace(root / PAGE, render(content, TEMPLATE))
    return said


def _failed(row: Row) -> bool:
    return bool(row["outcome"] != "finished")


def _verdict(rows: list[Row]) -> dict[str, str]:
    passing = sum(bool(row["passes"]) for row in rows)
    tone = "good" if passing == len(rows) else "thin" if passing else "bad"
    return {"tone": tone, "word": f"{passing} of {len(rows)} pass"}


def _tiles(plan: SweepPlan, rows: list[Row], summary: dict[str, Any]) -> list[tuple[str, str]]:
    times = known(rows, "time_to_aim [s]")
    tiles = [("runs", str(len(rows))), ("pass aim and limits", str(summary["passes"]))]
    if plan.base.aim is not None:
        tiles.append(("meet the aim", str(summary["met"])))
    if times:
        tiles += [("shortest time", duration(min(times))), ("longest time", duration(max(times)))]
    if heat := known(rows, "heat_removed [J]"):
        tiles.append(("heat a piece", f"{min(heat) / 1e3:.1f}-{max(heat) / 1e3:.1f} kJ"))
    return [*tiles, ("failed", str(len(summary["failed"])))]


def _caption(window: Window, plan: SweepPlan) -> dict[str, str]:
    if window.kind == "contour":
        text = "Each dot is a run; between them straight lines. The veiled part misses the pass line"
        return {
            "title": "Operating window",
            "caption": text + ("; hatched: beyond a limit." if plan.limits else "."),
        }
    if window.kind == "curves":
        asked = "for the band of each answer ask for ranges = true under [keep]"
        band = "the band holds the answer 19 times out of 20" if plan.keep.ranges else asked
        return {"title": "Operating window", "caption": f"Each dot is a run; {band}."}
    text = "Means over everything else that varies; the share is that of the variance which they explain."
    return {"title": "What it hangs on", "caption": text}


def _bands(window: Window, rows: list[Row]) -> Array | None:
    """Return the ends of each answer of a single curve."""
    if window.kind != "curves" or window.y is not None or window.result != "time_to_aim":
        return None
    assert window.x is not None
    bands = np.full((2, len(window.x.values)), np.nan)
    for row in rows:
        for n, end in enumerate(("low", "high")):
            if (value := row.get(f"time_to_aim.{end} [s]")) is not None:
                bands[n, window.x.values.index(row[window.x.head])] = value
    return bands if np.any(np.isfinite(bands)) else None


def _limited(plan: SweepPlan, window: Window, rows: list[Row]) -> list[tuple[str, Array, float, bool]]:
    """Return the limits on results that are not drawn themselves, on the grid of a contour."""
    if window.kind != "contour":
        return []
    assert window.x is not None
    assert window.y is not None
    heads, found = Heads(plan), []
    for name, ends in plan.limits.items():
        if name not in RESULTS or name == window.result:
            continue
        grid = np.full(window.grid.shape, np.nan)
        for row in rows:
            if (value := row[heads.results[name]]) is not None:
                grid[window.y.values.index(row[window.y.head]), window.x.values.index(row[window.x.head])] = (
                    value
                )
        if not np.any(np.isfinite(grid)):
            continue
        for level, below in zip(ends, (False, True), strict=True):
            if np.isfinite(level):
                found.append((_end(name, level, below), grid, level, below))
    return found


def _end(name: str, level: float, below: bool) -> str:
    factor, unit = _SIGNS[name]
    return f"{RESULTS[name][1]} at {'most' if below else 'least'} {level * factor:.4g} {unit}"


def _limit(name: str, ends: tuple[float, float], plan: SweepPlan) -> str:
    told = []
    for level, below in zip(ends, (False, True), strict=True):
        if np.isfinite(level):
            if name in RESULTS:
                told.append(_end(name, level, below))
            else:
                told.append(
                    f"{name} at {'most' if below else 'least'} {level:.4g} {plan.unit_of(name)}".rstrip()
                )
    return "; ".join(told)


def _edges(window: Window) -> list[tuple[str, str]]:
    """Return where the pass line runs, as a table: value of y, and x in words."""
    if window.x is None or window.line is None or window.y is None:
        return []
    found = [*passes_of(window)]
    at_base = pass_at_base(window)
    if at_base is not None and at_base.at not in window.y.values:
        found = sorted([*found, at_base], key=lambda p: p.at)
    return [(window.y.said(p.at), p.said(window.x)) for p in found]


def _best(plan: SweepPlan, rows: list[Row], window: Window) -> list[list[str]]:
    """Return the runs that are done first, those that pass before the others."""
    heads = Heads(plan)
    head = heads.results[window.result]
    usable = [row for row in rows if row[head] is not None]
    usable.sort(key=lambda row: (not row["passes"], row[head] if window.below else -row[head]))
    table = []
    for row in usable[:MOST_ROWS]:
        cells = [setting(plan, name, row[h]).removeprefix(f"{name} ") for name, h in heads.varied.items()]
        for name, digits in _DIGITS.items():
            value = row[heads.results[name]]
            cells.append("-" if value is None else f"{value * _SIGNS[name][0]:.{digits}f}")
        table.append([("yes" if row["passes"] else "no"), *cells])
    return table


def _weight(weight: Weight, window: Window) -> tuple[str, str, str, str]:
    factor, unit = (1 / 60.0, "min") if window.result == "time_to_aim" else (1.0, "K")
    ends = [f"{v:.4g}" if isinstance(v, float) else str(v) for v in (weight.low, weight.high)]
    return (
        weight.name,
        f"{weight.swing * factor:.1f} {unit}",
        f"{100 * weight.share:.0f} %",
        " to ".join(ends),
    )


def _settings(plan: SweepPlan, heads: Heads, row: Row) -> str:
    return ", ".join(setting(plan, name, row[h]) for name, h in heads.varied.items())
