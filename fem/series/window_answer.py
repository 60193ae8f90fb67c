"""The answer of a sweep in one sentence."""

from __future__ import annotations

from typing import Any

from fem.result.answer import duration
from fem.series.sweep_plan import SweepPlan
from fem.series.table import Heads, Row, known
from fem.series.weights import weights_of
from fem.series.window import Dimension, Window, pass_at_base, passes_of, turned


def answer(plan: SweepPlan, rows: list[Row], window: Window) -> str:
    """Return what the sweep shows, in one sentence."""
    finished = [row for row in rows if row["outcome"] == "finished"]
    if not finished:
        return f"None of the {len(rows)} runs finished; the reasons stand below."
    counted = _counted(rows, finished)
    passes = passes_of(window)
    if not passes:
        weights = weights_of(plan, rows, window.result)
        first = f"; it hangs on {weights[0].name} first" if len(weights) > 1 else ""
        return _between(plan, window, finished) + first + counted
    what = _asked(plan, window)
    if window.y is None:
        return f"{what} with {passes[0].said(window.x)}{counted}"  # type: ignore[arg-type]
    for seen in (window, turned(window)) if window.kind == "contour" else ():
        at_base = pass_at_base(seen)
        if at_base is not None and (at_base.edge is not None or seen is not window):
            assert seen.x is not None
            assert seen.y is not None
            place = f"{seen.y.name} {seen.y.said(at_base.at)}, as in the base"
            return f"At {place}, {_lower(what)} with {at_base.said(seen.x)}{counted}"
    ends = [passes[0], passes[-1]] if window.y.numeric else passes[:3]
    told = "; for ".join(f"{_quoted(window.y, p.at)} with {p.said(window.x)}" for p in ends)  # type: ignore[arg-type]
    return f"{what} for {window.y.name} {told}{counted}"


def _quoted(dimension: Dimension, value: Any) -> str:
    return dimension.said(value) if dimension.numeric else f'"{value}"'


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
