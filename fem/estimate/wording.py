"""An outlook in plain words: one sentence first, then what stands behind it."""

from __future__ import annotations

from typing import Any

from fem.estimate.outlook import FILM
from fem.result.answer import duration

BAR = 24
"""Characters of the longest bar of the chart of resistances."""


def sentence(said: dict[str, Any]) -> str:
    """Return what an outlook comes to, in one sentence.

    Parameters
    ----------
    said
        From `outlook`.

    """
    found = {e["method"]: e for e in said["estimates"] if e["time_s"] is not None}
    parts = []
    for method, word in (("Pham", "about"), ("Plank", "at least")):
        if method in found:
            # Plank's formula is a bound wherever it is used; its range is where it is more than that.
            outside = "" if method == "Plank" or found[method]["in_range"] else ", outside its range"
            parts.append(f"{word} {duration(found[method]['time_s'])} ({method}{outside})")
    if parts:
        text = "By hand " + ", ".join(parts)
        within = said["aim"]["within_s"] if said["aim"] else None
        text += f", of {duration(within)} given" if within else ""
    else:
        text = f"By hand nothing can be said: {said['estimates'][0]['remarks'][0]}"
    met = said["resistances_m2K_per_W"]
    if not met:
        return f"{text}."
    most = max(met, key=lambda name: met[name])
    share = 100.0 * met[most] / sum(met.values())
    return f"{text}; the {most} is the largest resistance ({share:.0f} %): {_knob(most)}."


def details(said: dict[str, Any]) -> list[tuple[str, str]]:
    """Return what stands behind the sentence, as pairs of a label and a text."""
    lines = [
        (f"mass of the {region}", f"{1e3 * mass:.1f} g, {1e6 * said['volume_m3'][region]:.1f} mL a piece")
        for region, mass in said["mass_kg"].items()
    ]
    if said["biot"] is not None:
        deep = 1e3 * said["depth_m"]
        lines.append(("Biot number", f"{said['biot']:.2f}; the core lies {deep:.1f} mm deep"))
    met = said["resistances_m2K_per_W"]
    for name, value in met.items():
        share = value / sum(met.values())
        bar = "#" * round(BAR * share)
        lines.append((f"resistance: {name}", f"{bar:<{BAR}} {100 * share:3.0f} %, {value:.2g} m2K/W"))
    for estimate in said["estimates"]:
        parts = [] if estimate["time_s"] is None else [duration(estimate["time_s"])]
        label = f"by {estimate['method']}" if parts else estimate["method"]
        lines.append((label, "; ".join([*parts, *estimate["remarks"]])))
    mesh = said["mesh"]
    sizes = ", ".join(f"{1e3 * size:.2g} mm in the {region}" for region, size in mesh["cell_m"].items())
    text = f"{mesh['nodes']} nodes, {mesh['cells']} cells of {sizes}"
    lines.append(("mesh", f"{text}; worst cell {mesh['quality']:.2f}, best 1"))
    lines.append(("a run takes", f"about {max(1, round(said['effort']['seconds']))} s"))
    return lines + [("caution", caution) for caution in said["cautions"]]


def _knob(name: str) -> str:
    if name == FILM:
        return "agitation, or faster air, is the knob"
    if name == "product":
        return "a thinner piece is the knob"
    return "a thinner or better conducting one is the knob"
