"""The report's numbers: tiles, tables and what stands in them, from a run's summary and curves."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from fem.result.answer import duration
from fem.result.confidence import by_rank, error_text, known, ratio_of
from fem.result.folder import Array

# What the page shows in places of its own, and what says nothing by itself.
_SHOWN = {"schema", "title", "outcome", "why", "aim", "slowest", "heat_removed_J", "heat_J", "mass_kg"}
_SHOWN |= {"energy_imbalance", "time_s", "stages", "effort", "cautions", "versions", "estimates"}
_SHOWN |= {"uncertainty", "numerical_error"}


def aim_text(aim: Mapping[str, Any]) -> str:
    """Return what was asked, in words."""
    who = "slowest point" if aim["at"] == "slowest" else f'point "{aim["at"]}"'
    within = f" within {duration(aim['within_s'])}" if aim["within_s"] else ""
    return f"{who} at {aim['reach_degC']:g} degC{within}"


def verdict(summary: Mapping[str, Any]) -> dict[str, str]:
    """Return the verdict's word and the class that colours it; the word says it without colour."""
    aim = summary["aim"]
    if summary["outcome"] != "finished":
        word = {"running": "Unfinished", "failed": "Failed", "interrupted": "Interrupted"}[summary["outcome"]]
        return {"word": word, "tone": "bad"}
    if aim is None:
        return {"word": "No aim set", "tone": "plain"}
    if not aim["met"]:
        return {"word": "No", "tone": "bad"}
    if aim["within_s"] is None:
        return {"word": "Reached", "tone": "plain"}
    thin = (aim["within_s"] - aim["time_s"]) / aim["within_s"] < 0.05
    return {"word": "Yes, just" if thin else "Yes", "tone": "thin" if thin else "good"}


def tiles(summary: Mapping[str, Any], answered: bool = False) -> list[tuple[str, str]]:
    """Return the few numbers that people quote, each with its label; without the time if that is said."""
    aim, found = summary["aim"], []
    if aim is not None and not answered:
        found.append(
            ("time to the aim", duration(aim["time_s"]) if aim["time_s"] is not None else "not reached")
        )
    if aim is not None:
        if aim["within_s"] is not None:
            found.append(("time given", duration(aim["within_s"])))
        if aim["within_s"] is not None and aim["time_s"] is not None:
            found.append(("margin", f"{100 * (1 - aim['time_s'] / aim['within_s']):+.0f} %"))
    else:
        found.append(("time run", duration(summary["time_s"])))
    x, y = (1e3 * v for v in summary["slowest"]["at_m"][:2])
    found.append(("slowest point, mm", f"{x:.1f}, {y:.1f}"))
    if summary["stages"]:
        last = summary["stages"][-1]
        found.append(("once equalised", f"{last['mean_degC']:.1f} degC"))
        if last["ice"] is not None:
            found.append(("ice, by mass", f"{100 * last['ice']:.0f} %"))
    found.append(("heat per piece", f"{summary['heat_removed_J'] / 1e3:.1f} kJ"))
    return found


def regions(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return mass [g], heat given up [kJ] and heat per mass [kJ/kg] of each region, per piece."""
    return [
        {
            "name": name,
            "mass": 1e3 * summary["mass_kg"][name],
            "heat": heat / 1e3,
            "each": heat / 1e3 / summary["mass_kg"][name] if summary["mass_kg"][name] > 0 else None,
        }
        for name, heat in summary["heat_J"].items()
    ]


def loads(curves: Mapping[str, Array]) -> list[dict[str, Any]]:
    """Return the highest, lowest and mean heat load of each surface, per piece [W]."""
    found = []
    for column, values in curves.items():
        if not column.startswith("heat_load.") or not np.all(np.isfinite(values)):
            continue
        time = curves["time [s]"]
        lasted = float(time[-1] - time[0])
        mean = float(np.trapezoid(values, time)) / lasted if lasted > 0 else float(values[0])
        name = column[len("heat_load.") : -len(" [W]")]
        low, high = float(values.min()), float(values.max())
        found.append({"name": name, "highest": high, "lowest": low, "mean": mean})
    return found


def estimates(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return the estimates beside the run's own time."""
    rows = []
    for estimate in by_rank(summary.get("estimates") or []):
        time, remarks = estimate["time_s"], estimate.get("remarks") or []
        band = estimate.get("band")
        rows.append(
            {
                "method": estimate["method"],
                "time": duration(time) if time is not None else "–",
                "ratio": ratio_of(summary, estimate) if time is not None else None,
                "band": f"{band[0]:g} to {band[1]:g} allowed" if band and estimate.get("in_range") else "",
                "in_range": estimate.get("in_range"),
                "remarks": remarks if isinstance(remarks, str) else "; ".join(remarks),
            }
        )
    return rows


def stages(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return the stage ends; each number with its half-width, empty where it has none to show."""
    uncertainty = summary.get("uncertainty") or {}
    widths = {entry["name"]: entry for entry in uncertainty.get("stages") or []}
    rows = []
    for stage in summary["stages"]:
        width = widths.get(stage["name"], {})
        ended = known(width.get("ended_s_half_width")) or 0.0
        # What ended the stage is the same however the inputs lie.
        held = stage["why"].startswith("slowest") and stage["why"].endswith("was reached")
        slowest = "" if held else _half(width.get("slowest_degC_half_width"), 1)
        rows.append(
            {
                **stage,
                "ended_half": f"± {error_text(ended)}" if ended >= 0.5 else "",
                "slowest_half": slowest,
                "mean_half": _half(width.get("mean_degC_half_width"), 1),
            }
        )
    return rows


def heat_half_width(summary: Mapping[str, Any]) -> str:
    """Return the half-width of the heat removed by the last stage's end [kJ]; empty where not known."""
    uncertainty, ended = summary.get("uncertainty") or {}, summary["stages"]
    widths = {entry["name"]: entry for entry in uncertainty.get("stages") or []}
    width = known(widths.get(ended[-1]["name"], {}).get("heat_removed_J_half_width")) if ended else None
    return _half(width / 1e3, 2) if width is not None else ""


def _half(width: float | None, digits: int) -> str:
    """Return a half-width with so many decimals; empty where it is not known or rounds to nothing."""
    size = known(width)
    return f"± {size:.{digits}f}" if size is not None and round(size, digits) > 0.0 else ""


def further(summary: Mapping[str, Any]) -> list[tuple[str, str]]:
    """Return what else the run found, such as a range of times, as labels and texts."""
    found: list[tuple[str, str]] = []
    for key, value in summary.items():
        if key in _SHOWN:
            continue
        entries = {f"{key}, {k}": v for k, v in value.items()} if isinstance(value, dict) else {key: value}
        for name, entry in entries.items():
            if isinstance(entry, bool):
                found.append((_words(name), "yes" if entry else "no"))
            elif isinstance(entry, str) and len(entry) < 200:
                found.append((_words(name), entry))
            elif isinstance(entry, (int, float)) and np.isfinite(entry):
                found.append((_words(name), _with_unit(name, float(entry))))
    return found[:12]


def _words(name: str) -> str:
    for ending in ("_degC", "_s", "_J", "_kg", "_m", "_W"):
        name = name.removesuffix(ending)
    return name.replace("_", " ")


def _with_unit(name: str, value: float) -> str:
    if name.endswith("_s"):
        return duration(value)
    unit = next((u for u in ("degC", "J", "kg", "m", "W") if name.endswith(f"_{u}")), "")
    return f"{value:.4g} {unit}".strip()
