"""The answer in plain words, from a summary alone: one sentence first, then what stands behind it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

UNFINISHED = "running"


def sentence(summary: dict[str, Any], *, with_place: bool = False) -> str:
    """Return the answer in one sentence.

    Parameters
    ----------
    summary
        As in ``summary.json``.
    with_place
        Whether it says where the slowest point is.

    """
    place = f", at {_place(summary)}," if with_place else ""
    outcome = summary.get("outcome")
    aim = summary.get("aim")
    if outcome == UNFINISHED:
        return f"Unfinished: the run stands at {duration(summary['time_s'])}; it goes on, or it was killed."
    if outcome != "finished":
        return f"The run {outcome} at {duration(summary['time_s'])}: {summary['why']}."
    if aim is None:
        slowest = summary["slowest"]
        temperature = f"{slowest['temperature_degC']:.1f} degC"
        return f"After {duration(summary['time_s'])} the slowest point{place} is at {temperature}."
    who = f"The slowest point{place}" if aim["at"] == "slowest" else f'The point "{aim["at"]}"'
    reach = f"{aim['reach_degC']:g} degC"
    if aim["time_s"] is None:
        last = summary["slowest"]["temperature_degC"]
        text = f"{who} does not reach {reach} within the {duration(summary['time_s'])} that were run"
        if aim["at"] == "slowest":
            text += f": it ends at {last:.1f} degC"
        return text + (f"; no, {duration(aim['within_s'])} is not enough." if aim["within_s"] else ".")
    found = f"{duration(aim['time_s'])}{_likely(summary)}"
    return f"{who} reaches {reach} after {found}{_verdict(aim)}{_knob(summary)}."


def _likely(summary: dict[str, Any]) -> str:
    """Say the interval that the time lies in 19 times out of 20."""
    spread = (summary.get("uncertainty") or {}).get("time_s")
    return f" (likely {span(spread['low'], spread['high'])})" if spread else ""


def _knob(summary: dict[str, Any]) -> str:
    """Say what the time hangs on first."""
    inputs = (summary.get("uncertainty") or {}).get("inputs")
    return f"; it hangs on {input_names(inputs)[0]} first" if inputs else ""


def span(low: float, high: float) -> str:
    """Return an interval of times in one unit, to two figures: no range is known better.

    >>> span(958.0, 1420.0), span(61.0, 88.0), span(17100.0, 25000.0)
    ('16-24 min', '61-88 s', '4.8-6.9 h')
    """
    unit, size = ("s", 1.0) if high < 120.0 else ("min", 60.0) if high < 7200.0 else ("h", 3600.0)
    return "-".join(_two_figures(x / size) for x in (low, high)) + f" {unit}"


def _two_figures(value: float) -> str:
    return f"{value:.0f}" if value >= 10.0 else f"{value:.1f}"


def _place(summary: dict[str, Any]) -> str:
    x, y = (1e3 * value for value in summary["slowest"]["at_m"][:2])
    return f"({x:.1f}, {y:.1f}) mm"


def _verdict(aim: dict[str, Any]) -> str:
    """Say whether the time given is enough, and by how much."""
    within, time = aim["within_s"], aim["time_s"]
    if within is None:
        return ""
    margin = abs(within - time) / within
    if aim["met"]:
        words = "is just enough" if margin < 0.05 else "is enough"
        return f"; yes, {duration(within)} {words}, {100 * margin:.0f} % to spare"
    return f"; no, {duration(within)} is not enough, {duration(time - within)} are missing"


def details(summary: dict[str, Any]) -> list[tuple[str, str]]:
    """Return what stands behind the sentence, as pairs of a label and a text."""
    lines: list[tuple[str, str]] = []
    slowest = summary.get("slowest")
    if slowest:
        place = f"{_place(summary)}, at {slowest['temperature_degC']:.1f} degC when the run ended"
        lines.append(("slowest point", place))
    lines += _agreement(summary)
    for region, heat in summary.get("heat_J", {}).items():
        mass = summary["mass_kg"][region]
        lines.append((f"heat of the {region}", f"{heat / 1e3:.2f} kJ from {1e3 * mass:.1f} g a piece"))
    for stage in summary.get("stages", []):
        ice = "" if stage["ice"] is None else f", ice {100 * stage['ice']:.0f} % of the mass"
        text = (
            f"ended after {duration(stage['ended_s'])}, {stage['why']}; slowest {stage['slowest_degC']:.1f}, "
            f"once equalised {stage['mean_degC']:.1f} degC{ice}"
        )
        lines.append((f"stage {stage['name']}", text))
    if "energy_imbalance" in summary:
        off = f"{abs(summary['energy_imbalance']):.0e}"
        text = f"heat through the surfaces and heat given up agree to {off} of it"
        lines.append(("ledger", text))
    effort = summary.get("effort")
    if effort:
        text = f"{effort['nodes']} nodes, {effort['steps']} steps, {effort['factorisations']} factorisations"
        lines.append(("effort", f"{text}, {effort['elapsed_s']:.1f} s"))
    lines += [("caution", caution) for caution in summary.get("cautions", [])]
    return lines


def _agreement(summary: dict[str, Any]) -> list[tuple[str, str]]:
    """Return how far the time is from the exact one of its model, and what other methods say."""
    lines = []
    time = (summary.get("aim") or {}).get("time_s")
    error = (summary.get("numerical_error") or {}).get("time_s")
    if time and error is not None:
        lines.append(("numerical error", f"{error:.1f} s, {100 * error / time:.1g} % of the time"))
    methods = [e for e in summary.get("estimates") or [] if e.get("time_s")]
    if methods:
        lines.append(("by other methods", ", ".join(_by_method(e) for e in methods)))
    return lines


def _by_method(estimate: dict[str, Any]) -> str:
    """Say what another method makes of the case."""
    time = duration(estimate["time_s"])
    if any("lower bound" in remark for remark in estimate["remarks"]):
        return f"at least {time} ({estimate['method']})"
    return f"{time} ({estimate['method']}" + (")" if estimate["in_range"] else ", outside its range)")


def ranking(summary: dict[str, Any], width: int = 12) -> list[tuple[str, str, str, str]]:
    """Return a row for each uncertain input, the most important first.

    Name, half-width, a bar of its effect and plain words.
    """
    inputs = (summary.get("uncertainty") or {}).get("inputs") or []
    effects = [(entry["effect_of_less_s"], entry["effect_of_more_s"]) for entry in inputs]
    # A derivative that could not be taken is NaN, or null in other hands' files.
    sizes = [max(abs(v) if v is not None and v == v else 0.0 for v in both) for both in effects]
    most = max(sizes, default=0.0) or 1.0
    return [
        (name, f"+-{entry['half_width']}", "#" * max(1, round(width * size / most)), entry["words"])
        for name, entry, size in zip(input_names(inputs), inputs, sizes, strict=True)
    ]


def input_names(inputs: Sequence[Mapping[str, Any]]) -> list[str]:
    """Return what the uncertain inputs are called; those of one name with stage and surface, or their key.

    >>> keys = ("stages.dip.surfaces.outside.h", "stages.hold.surfaces.outside.h", "shape.thickness")
    >>> input_names([{"key": k, "name": n} for k, n in zip(keys, ("agitation", "agitation", "thickness"))])
    ['agitation (dip)', 'agitation (hold)', 'thickness']
    """
    names = [str(entry["name"]) for entry in inputs]
    parts = [str(entry["key"]).split(".") for entry in inputs]
    for pick in (slice(1, 2), slice(1, -1)):
        told = [
            f"{name} ({', '.join(p for p in part[pick] if p != 'surfaces')})"
            if names.count(name) > 1
            else name
            for name, part in zip(names, parts, strict=True)
        ]
        if len(set(told)) == len(told):
            break
    return told


def duration(seconds: float) -> str:
    """Return a time as the trade says it: seconds, minutes or hours, to three figures.

    >>> duration(43.2), duration(1161.2), duration(19440)
    ('43.2 s', '19.4 min', '5.40 h')
    """
    if seconds < 120.0:
        return f"{seconds:.3g} s"
    if seconds < 7200.0:
        minutes = seconds / 60.0
        return f"{minutes:.0f} min" if abs(minutes - round(minutes)) < 0.005 else f"{minutes:.1f} min"
    return f"{seconds / 3600.0:.2f} h"
