"""``report.html``: the page that a run folder is brought to a meeting as, made from the folder alone."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from fem.result import advice, map_pictures, numbers, pictures, range_pictures
from fem.result.answer import duration, sentence
from fem.result.confidence import answers, known, own_time, time_range
from fem.result.contacts import freezing_regions, is_axisymmetric
from fem.result.contents import Contents, read_contents
from fem.result.disk import replace
from fem.result.folder import Array
from fem.result.maps import Frame, NoMaps, last_frame
from fem.result.page import render, typeset

REPORT = "report.html"
# So long a case text is left to the screen and to case.toml: on paper it would take a third page.
LONGEST_PRINTED, LETTERS_A_LINE = 72, 52

Limits = Mapping[str, tuple[float, float]]


def write_report(folder: Path, into: Path | None = None, limits: Limits | None = None) -> Path:
    """Write the report of a run folder.

    Parameters
    ----------
    folder
        A run folder, from this machine or another, finished or not.
    into
        File to write; None for ``report.html`` in the folder.
    limits
        Field array's name -> lowest and highest value of its colours, in the unit of the array;
        gives the reports of a series the same ones. What is not named gets whole steps.

    Returns
    -------
    The file.

    Raises
    ------
    CaseError
        Where it is no run folder, or one that cannot be shown.
    OSError
        Where the file cannot be written.

    """
    path = into if into is not None else folder / REPORT
    page = render(_content(read_contents(folder), limits or {}))
    replace(path, page)
    return path


def _content(run: Contents, limits: Limits) -> dict[str, Any]:
    """Gather what the page says, in the words of its template."""
    summary = run.summary
    try:
        frame, why_no_maps = last_frame(run.folder), ""
    except NoMaps as reason:
        frame, why_no_maps = None, str(reason)
    maps, left_out = _maps(run, frame, limits) if frame is not None else ([], [f"Maps: {why_no_maps}."])
    left_out += [f"{'Curves' if what == 'curves' else 'Case'}: {why}." for what, why in run.missing.items()]
    seen = _lowest(frame)
    aim = summary["aim"]
    lines = run.case_text.splitlines()
    return {
        "title": summary["title"].strip() or "A run",
        "summary": summary,
        "answer": sentence(summary, with_place=True),
        "verdict": numbers.verdict(summary),
        "answers": answers(summary),
        "tiles": numbers.tiles(summary, answered=bool(answers(summary))),
        "figures": [*_confidence(summary, left_out), *_figures(run, left_out)],
        "maps": maps,
        "maps_at": frame.time if frame is not None else None,
        "left_out": left_out,
        "stages": numbers.stages(summary),
        "regions": numbers.regions(summary),
        "heat_half": numbers.heat_half_width(summary),
        "heat_error": known((summary.get("numerical_error") or {}).get("heat_removed_J")),
        "loads": numbers.loads(run.curves),
        "estimates": numbers.estimates(summary),
        "assumptions": advice.assumptions(run),
        "cautions": advice.cautions(run, advice.coldest(run, seen)),
        "checks": advice.checks(run),
        "further": numbers.further(summary),
        "case_text": run.case_text,
        "case_long": sum(1 + len(line) // LETTERS_A_LINE for line in lines) > LONGEST_PRINTED,
        "case_lines": len(lines),
        "aim_text": numbers.aim_text(aim) if aim is not None else "",
    }


def _confidence(summary: dict[str, Any], left_out: list[str]) -> list[dict[str, Any]]:
    """Draw how sure the time is, and what it hangs on."""
    uncertainty, own = summary.get("uncertainty"), own_time(summary)
    figures: list[dict[str, Any]] = []
    if own is None:
        return []
    if time_range(summary) is not None or any(e["time_s"] for e in summary.get("estimates") or []):
        parts = ["Dot: this run"]
        if time_range(summary) is not None:
            parts.append("pale bar: where it lies 19 times in 20")
        parts.append("diamonds: estimates, with the band that theory allows; hollow: outside their range")
        figures.append(
            {
                "title": "The time and its estimates",
                "svg": range_pictures.times(summary),
                "alt": f"Time to the aim, its range and its estimates. {sentence(summary)}",
                "caption": "; ".join(parts) + ".",
            }
        )
    if uncertainty is None or not uncertainty["inputs"]:
        left_out.append("Likely range, and what the time hangs on: this run carried none along.")
        return figures
    more = len(uncertainty["inputs"]) - range_pictures.MOST_INPUTS
    figures.append(
        {
            "title": "What the time hangs on",
            "svg": range_pictures.effects(summary),
            "alt": "Change of the time with each input: "
            + "; ".join(e["words"] for e in uncertainty["inputs"]),
            "caption": f"Each input at the ends of its interval, which are what {uncertainty['source']}."
            + (f" {more} more matter less." if more > 0 else ""),
            "remarks": uncertainty.get("remarks") or [],
        }
    )
    return figures


def _figures(run: Contents, left_out: list[str]) -> list[dict[str, str]]:
    """Draw the curves, the fronts and the heat."""
    summary, figures = run.summary, []
    stages = summary["stages"]
    if run.curves:
        figures.append(
            {
                "title": "Temperatures",
                "svg": pictures.curves(run.curves, stages, summary["aim"]),
                "alt": f"Temperature against time. {sentence(summary)}",
                "caption": "Slowest point, mean and watched points; shaded bands are the stages.",
            }
        )
        if run.fronts and len(run.fronts["time [s]"]) and len(run.fronts) > 1:
            figures.append(
                {
                    "title": "Fronts",
                    "svg": pictures.fronts(run.fronts, stages),
                    "alt": f"Position and speed of the front against time along {_named_rays(run.fronts)}.",
                    "caption": f"Distance from the start of each ray ({_named_rays(run.fronts)}), and its "
                    f"speed as a running mean over {duration(pictures.smoothing(run.fronts['time [s]']))}.",
                }
            )
        else:
            left_out.append("Fronts: the run watched no ray.")
        figures.append(
            {
                "title": "Heat, per piece",
                "svg": pictures.heat(run.curves, stages),
                "alt": f"Heat load and heat removed against time; {summary['heat_removed_J'] / 1e3:.1f} kJ "
                "at the end.",
                "caption": "Heat leaving through each surface, and all that has left since the start.",
            }
        )
    return figures


def _named_rays(fronts: Mapping[str, Array]) -> str:
    ending = ".position [mm]"
    return ", ".join(name.removesuffix(ending) for name in fronts if name.endswith(ending)) or "no ray"


class _Map(NamedTuple):
    """One map: which array, how it is named, in which unit and colours, and by which steps its limits go."""

    array: str
    title: str
    label: str
    scale: float
    palette: str
    step: float
    floor: float | None
    product_only: bool


_TEMPERATURE = _Map(
    "temperature_degC", "Temperature", "temperature in °C", 1.0, "cividis", 5.0, None, product_only=False
)
_ICE = _Map("ice", "Ice", "ice in % of the mass", 100.0, "Blues", 100.0, 0.0, product_only=True)
_FREEZING = _Map(
    "local_freezing_time_s", "Local freezing time", "", 1.0 / 60.0, "viridis", 5.0, 0.0, product_only=True
)


def _maps(run: Contents, frame: Frame, limits: Limits) -> tuple[list[dict[str, Any]], list[str]]:
    """Draw the last frame; return the maps and what was left out."""
    product = _product(run, frame)
    axes = ("r", "z") if is_axisymmetric(run.case) else ("x", "y")
    x, y = (1e3 * v for v in run.summary["slowest"]["at_m"][:2])
    drawn, left_out = [], []
    for wanted in (_TEMPERATURE, _ICE, _FREEZING._replace(label=f"time to {_end(frame)} in min")):
        shown = product if wanted.product_only else np.ones_like(product)
        values = wanted.scale * frame.values.get(wanted.array, np.full(len(frame.points), np.nan))
        inside = values[np.unique(frame.triangles[shown])]
        known = inside[np.isfinite(inside)]
        if not len(known):
            why = (
                "no place of the product has a value"
                if wanted.array in frame.values
                else _absent(wanted.array)
            )
            left_out.append(f"Map of {wanted.title.lower()}: {why}.")
            continue
        span = map_pictures.nice_limits(known, wanted.step, wanted.floor)
        if wanted.array in limits:
            low, high = limits[wanted.array]
            span = wanted.scale * low, wanted.scale * high
        colours = map_pictures.Colours(span, wanted.palette, wanted.label)
        drawn.append(
            {
                "title": wanted.title,
                "wide": map_pictures.is_wide(frame),
                "svg": map_pictures.colour_map(frame, values, shown, colours, (x, y), axes),
                "alt": f"Map of the section: {wanted.label}, from {known.min():.3g} to {known.max():.3g}; "
                f"the slowest point is marked at ({x:.1f}, {y:.1f}) mm.",
            }
        )
    return drawn, left_out


def _absent(array: str) -> str:
    if array == _FREEZING.array:
        return "only the last frame of a run that came to its end holds it"
    return "the frame does not hold it"


def _end(frame: Frame) -> str:
    through = frame.frozen_through
    return typeset(f"{through:g} degC") if through is not None else "the end"


def _product(run: Contents, frame: Frame) -> NDArray[np.bool_]:
    """Return which triangles are product: those whose region freezes, or all if that is not known."""
    names = frame.names or tuple(run.summary["heat_J"])
    frozen = freezing_regions(run.case)
    inside = np.isin(frame.region, [n for n, name in enumerate(names) if name in frozen])
    return inside if inside.any() else np.ones_like(inside)


def _lowest(frame: Frame | None) -> float | None:
    values = frame.values.get("temperature_degC") if frame is not None else None
    if values is None or not np.any(np.isfinite(values)):
        return None
    return float(np.nanmin(values))
