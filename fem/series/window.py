"""The operating window: which settings of a sweep meet what is asked."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np

from fem.curve import Array
from fem.series.sweep_plan import SweepPlan
from fem.series.table import Heads, Row, known
from fem.series.variations import number_and_unit

# So many options are still told apart as curves of one picture.
MOST_CURVES = 6


@dataclass(frozen=True)
class Dimension:
    """One axis of the picture.

    Parameters
    ----------
    name, unit
        Of what varies; the unit is None for names.
    head
        Its column.
    values
        In order, each once: numbers, or names.
    log
        Whether they are spaced so.
    base
        Where the base stands, if that is known.
    limits
        Least and most that the plan allows.

    """

    name: str
    unit: str | None
    head: str
    values: list[Any]
    log: bool
    base: float | None
    limits: tuple[float, float]

    @property
    def numeric(self) -> bool:
        """Whether it has numbers."""
        return self.unit is not None

    def said(self, value: Any) -> str:
        """Return a value with its unit."""
        return f"{value:.4g} {self.unit}".rstrip() if self.unit is not None else str(value)


@dataclass(frozen=True)
class Window:
    """What a sweep's picture shows.

    Parameters
    ----------
    kind
        A contour over two numbers, curves over one, or a ranking.
    x, y
        Dimensions; of curves `y` holds the names of several, or is None.
    result
        Word of what is drawn.
    line
        Time [s] or temperature [degC] that has to be met; None where there is none.
    below
        Whether it is met below the line.
    grid
        The result on the dimensions, NaN where there is none, shape (y, x); empty of a ranking.

    """

    kind: Literal["contour", "curves", "ranking"]
    x: Dimension | None
    y: Dimension | None
    result: str
    line: float | None
    below: bool
    grid: Array


def window_of(plan: SweepPlan, rows: list[Row]) -> Window:
    """Return what to draw of a sweep."""
    heads = Heads(plan)
    result = "time_to_aim" if known(rows, heads.results["time_to_aim"]) else "slowest"
    line, below = _line(plan, result)
    dims = [_dimension(plan, axis.names[0], heads, rows) for axis in plan.axes if len(axis.rows) > 1]
    # Of values walked side by side one stands for all; drawn samples have no order to walk along.
    scattered = any(variation.sampled for variation in plan.vary.values())
    numeric = sorted((d for d in dims if not scattered), key=lambda d: not d.numeric)
    shape = [d.numeric for d in numeric]
    x, y = (*numeric, None, None)[:2]
    if x is not None and shape == [True, True]:
        kind: Literal["contour", "curves"] = "contour"
    elif x is not None and (shape == [True] or (shape == [True, False] and _few(y))):
        kind = "curves"
    else:
        return Window("ranking", None, None, result, line, below, np.empty((0, 0)))
    grid = np.full((len(y.values) if y else 1, len(x.values)), np.nan)
    for row in rows:
        if (value := row[heads.results[result]]) is not None:
            grid[y.values.index(row[y.head]) if y else 0, x.values.index(row[x.head])] = value
    return Window(kind, x, y, result, line, below, grid)


def _few(names: Dimension | None) -> bool:
    return names is not None and len(names.values) <= MOST_CURVES


def _line(plan: SweepPlan, result: str) -> tuple[float | None, bool]:
    """Return what has to be met, and whether below it."""
    aim = plan.base.aim
    settings = (choice for axis in plan.axes for row in axis.rows for choice in row)
    varies = any(key.startswith("aim") for choice in settings for key in choice.overrides)
    least, most = plan.limits.get(result, (-np.inf, np.inf))
    if result == "time_to_aim":
        within = aim.within if aim is not None and aim.within is not None and not varies else np.inf
        most = min(most, within)
        return (most if np.isfinite(most) else None), True
    if np.isfinite(most) or np.isfinite(least):
        return (most, True) if np.isfinite(most) else (least, False)
    if aim is None or varies:
        return None, True
    start = [plan.base.piece.start_temperature, *plan.base.piece.start.values()]
    return aim.reach, all(T is None or aim.reach <= T for T in start)


def _dimension(plan: SweepPlan, name: str, heads: Heads, rows: list[Row]) -> Dimension:
    variation, unit, head = plan.vary[name], plan.unit_of(name), heads.varied[name]
    values = list(dict.fromkeys(row[head] for row in rows))
    values = sorted(values) if unit is not None else values
    log = variation.spacing == "log"
    limits = plan.limits.get(name, (-np.inf, np.inf))
    return Dimension(name, unit, head, values, log, _base_of(plan, variation.key, unit), limits)


def _base_of(plan: SweepPlan, key: str | None, unit: str | None) -> float | None:
    """Return where the base stands, where its file says so in the same unit."""
    import tomllib

    from fem.case.locate import split

    node: Any = tomllib.loads(plan.base.text)
    for word in split(key) if key is not None else ():
        if isinstance(node, list):
            node = next((entry for entry in node if entry.get("name") == word), None)
        else:
            node = node.get(word) if isinstance(node, dict) else None
    read = number_and_unit(node)
    return read[0] if read is not None and read[1] == unit else None


@dataclass(frozen=True)
class Pass:
    """Where along x the line is met, at one value of y.

    Parameters
    ----------
    at
        Value of y; None where there is none.
    edge
        Where the line is crossed; None where all or none of the values pass.
    side
        "lower" or "higher" of the edge passes; "all", "none", or "parts" where it is crossed twice.

    """

    at: Any
    edge: float | None
    side: str

    def said(self, x: Dimension) -> str:
        """Return it in words."""
        tried = f"{x.name} from {x.said(x.values[0])} to {x.said(x.values[-1])}"
        if self.edge is None:
            words = {"all": f"any {tried}", "none": f"no {tried}"}
            return words.get(self.side, f"some {tried}, on no single side")
        return f"{x.name} {self.edge:.3g} {x.unit}".rstrip() + f" or {self.side}"


def passes_of(window: Window) -> list[Pass]:
    """Return where the line is met for each value of y."""
    if window.x is None or window.line is None:
        return []
    ats = window.y.values if window.y is not None else [None]
    return [_pass(window, at, line) for at, line in zip(ats, window.grid, strict=True)]


def pass_at_base(window: Window) -> Pass | None:
    """Return where the line is met at the base's value of y, between those that were run."""
    x, y = window.x, window.y
    if x is None or y is None or y.base is None or window.line is None or not y.numeric:
        return None
    if not y.values[0] <= y.base <= y.values[-1]:
        return None
    scale = np.log if y.log else np.asarray
    line = [float(np.interp(scale(y.base), scale(y.values), column)) for column in window.grid.T]
    return _pass(window, y.base, np.array(line))


def turned(window: Window) -> Window:
    """Return a contour with its axes exchanged."""
    return replace(window, x=window.y, y=window.x, grid=window.grid.T)


def _pass(window: Window, at: Any, results: Array) -> Pass:
    x, line = window.x, window.line
    assert x is not None
    assert line is not None
    met = results <= line if window.below else results >= line
    flips = np.flatnonzero(met[1:] != met[:-1])
    if len(flips) == 0:
        return Pass(at, None, "all" if met[0] else "none")
    if len(flips) > 1:
        return Pass(at, None, "parts")
    n = int(flips[0])
    low, high = results[n], results[n + 1]
    inside, side = (n, "lower") if met[n] else (n + 1, "higher")
    # Beyond the last value that was reached there is nothing to interpolate with.
    if not np.isfinite(low) or not np.isfinite(high):
        return Pass(at, float(x.values[inside]), side)
    share = (line - low) / (high - low)
    return Pass(at, float(x.values[n] + share * (x.values[n + 1] - x.values[n])), side)
