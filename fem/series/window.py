"""The operating window: which settings meet the aim, in one sentence and in the numbers behind it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np

from fem.curve import Array
from fem.result.answer import duration
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
    if shape == [True, True]:
        kind, x, y = "contour", dims[0], dims[1]
    elif shape == [True] or (shape == [True, False] and len(numeric[1].values) <= MOST_CURVES):
        kind, x, y = "curves", numeric[0], numeric[1] if len(numeric) > 1 else None
    else:
        return Window("ranking", None, None, result, line, below, np.empty((0, 0)))
    grid = np.full((len(y.values) if y else 1, len(x.values)), np.nan)
    for row in rows:
        if (value := row[heads.results[result]]) is not None:
            grid[y.values.index(row[y.head]) if y else 0, x.values.index(row[x.head])] = value
    return Window(kind, x, y, result, line, below, grid)  # type: ignore[arg-type]


def _line(plan: SweepPlan, result: str) -> tuple[float | None, bool]:
    """Return what has to be met, and whether below it."""
    aim = plan.base.aim
    varies = any(key.startswith("aim") for axis in plan.axes for row in axis.rows for c in row for key in c.overrides)
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
        if self.side in ("all", "none"):
            return f"{'every' if self.side == 'all' else 'no'} {x.name} tried"
        if self.edge is None:
            return f"some of the {x.name} tried, on no single side"
        return f"{x.name} {x.said(self.edge)} or {self.side}"


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


def answer(plan: SweepPlan, rows: list[Row], window: Window) -> str:
    """Return what the sweep shows, in one sentence."""
    finished = [row for row in rows if row["outcome"] == "finished"]
    if not finished:
        return f"None of the {len(rows)} runs finished; the reasons stand below."
    what = _asked(plan, window)
    counted = _counted(rows, finished)
    passes = passes_of(window)
    if not passes:
        return _between(plan, window, finished) + counted
    if window.y is None:
        return f"{what} with {passes[0].said(window.x)}{counted}"  # type: ignore[arg-type]
    at_base = pass_at_base(window)
    if at_base is not None:
        said = at_base.said(window.x)  # type: ignore[arg-type]
        return f"At {window.y.name} {window.y.said(at_base.at)}, as in the base, {_lower(what)} with {said}{counted}"
    if window.y.numeric:
        ends = [passes[0], passes[-1]]
    else:
        ends = passes[:3]
    told = "; at ".join(f"{window.y.said(p.at)} with {p.said(window.x)}" for p in ends)  # type: ignore[arg-type]
    return f"{what} at {window.y.name} {told}{counted}"


def _asked(plan: SweepPlan, window: Window) -> str:
    aim = plan.base.aim
    if window.result == "time_to_aim" and aim is not None and window.line is not None:
        return f"{aim.reach:g} degC is reached within {duration(window.line)}"
    return f"The slowest point ends {'below' if window.below else 'above'} {window.line:g} degC"


def _lower(text: str) -> str:
    return text[0].lower() + text[1:]


def _counted(rows: list[Row], finished: list[Row]) -> str:
    passing = sum(bool(row["passes"]) for row in rows)
    text = f"; {passing} of {len(rows)} runs pass"
    failed = len(rows) - len(finished)
    return text + (f", {failed} failed." if failed else ".")


def _between(plan: SweepPlan, window: Window, finished: list[Row]) -> str:
    heads = Heads(plan)
    head = heads.results[window.result]
    values = known(finished, head)
    best = min((row for row in finished if row[head] is not None), key=lambda row: row[head])
    settings = ", ".join(setting(plan, name, best[h]) for name, h in heads.varied.items())
    if window.result == "time_to_aim":
        return f"The aim is reached after {duration(min(values))} at best, with {settings}"
    return f"The slowest point ends between {min(values):.1f} and {max(values):.1f} degC"


def setting(plan: SweepPlan, name: str, value: Any) -> str:
    """Return a setting in words."""
    unit = plan.unit_of(name)
    return f"{name} {value:.4g} {unit}".rstrip() if unit is not None else f"{name} {value}"


@dataclass(frozen=True)
class Weight:
    """How much a result hangs on one thing that varies.

    Parameters
    ----------
    name
        What varies.
    share
        Of the result's variance, what the means over its settings explain, 0 to 1.
    low, high
        Settings with the smallest and the largest mean.
    swing
        Between these means, in the unit of the result.

    """

    name: str
    share: float
    low: Any
    high: Any
    swing: float


def weights_of(plan: SweepPlan, rows: Sequence[Row], window: Window) -> list[Weight]:
    """Return what the result hangs on, the most important first; drawn numbers are put in bins."""
    heads = Heads(plan)
    head = heads.results[window.result]
    usable = [row for row in rows if row[head] is not None]
    values = np.array([row[head] for row in usable])
    if len(values) < 3 or np.ptp(values) == 0.0:
        return []
    found = []
    for name, column in heads.varied.items():
        groups = _groups([row[column] for row in usable], plan.unit_of(name) is not None)
        means = np.array([values[at].mean() for _, at in groups])
        sizes = np.array([len(at) for _, at in groups])
        share = float(np.sum(sizes * (means - values.mean()) ** 2) / np.sum((values - values.mean()) ** 2))
        low, high = int(np.argmin(means)), int(np.argmax(means))
        found.append(Weight(name, share, groups[low][0], groups[high][0], float(means[high] - means[low])))
    return sorted(found, key=lambda w: -w.share)


def _groups(settings: list[Any], numeric: bool) -> list[tuple[Any, Array]]:
    """Return settings and the rows that have them; many numbers in bins of as many rows each."""
    distinct = list(dict.fromkeys(settings))
    if not numeric or len(distinct) <= max(4, len(settings) // 4):
        return [(s, np.flatnonzero([t == s for t in settings])) for s in distinct]
    order = np.argsort(np.array(settings, dtype=float), kind="stable")
    bins = np.array_split(order, max(2, min(6, len(settings) // 5)))
    return [(float(np.mean([settings[i] for i in at])), at) for at in bins]
