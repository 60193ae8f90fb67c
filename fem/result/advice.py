"""What a reader has to be told beside the numbers, picked by what the case is.

The facts behind the sentences are common practice of the trade without a source, except where one
is named in a comment.
"""

from __future__ import annotations

from typing import Any

from fem.result.answer import duration
from fem.result.confidence import error_text, known, time_range
from fem.result.contacts import Contact, contacts, size, table
from fem.result.contents import Contents

# Pieces and metal below this can freeze to lips and skin.
COLD_BURN = -25.0
# Eutectic of sodium chloride brine (brine as a refrigerant: encyclopaedia article).
EUTECTIC = -21.1


def coldest(contents: Contents, seen: float | None) -> float:
    """Return the lowest temperature that a piece's outside can have come to [degC].

    Parameters
    ----------
    contents
        The run.
    seen
        Lowest temperature of the last field frame [degC]; None where there is none.

    """
    if seen is not None:
        return seen
    around = [c.coolant[0] for c in contacts(contents.case) if c.coolant is not None]
    return min([*around, float(contents.summary["slowest"]["temperature_degC"])])


def cautions(contents: Contents, lowest: float) -> list[str]:
    """Return the cautions that apply, the run's own first.

    Parameters
    ----------
    contents
        The run.
    lowest
        Lowest temperature of the piece [degC], from `coldest`.

    """
    met = contacts(contents.case)
    cold = min((c.coolant[0] for c in met if c.coolant is not None), default=lowest)
    said = [_sentence(text) for text in contents.summary["cautions"]]
    # Listeria survives frozen storage (title read: "Frozen doesn't mean safe").
    said.append(
        "Freezing kills no germs: a mix that was not safe before is not safe after. Hygiene and heat "
        "treatment are decided elsewhere; nothing here speaks for the safety of food."
    )
    if lowest < COLD_BURN:
        said.append(
            f"Cold burns: parts of the piece or its mould come to {lowest:.0f} degC. Below about "
            f"{COLD_BURN:.0f} degC they freeze to lips and wet skin: gloves on the line, and no hand-out "
            "before the piece has warmed."
        )
    if any(c.liquid and c.coolant is not None and c.coolant[0] < 0.0 for c in met):
        said.append(_liquid(min(c.coolant[0] for c in met if c.liquid and c.coolant is not None)))
    if cold < -50.0:
        said.append(
            "At these temperatures nitrogen or carbon dioxide is likely: both push the air out of a room "
            "and have killed people. Oxygen alarms, ventilation and training come first, and no liquid may "
            "stay in the food."
        )
    elif cold < COLD_BURN:
        said.append(
            "Plants for this cold mostly run on ammonia or carbon dioxide: poisonous, or stifling unseen, "
            "under pressure. Keep to the alarms, the ventilation and the escape plan of the site."
        )
    if table(contents.case, "shape").get("form") != "bar":
        said.append(
            "Where the piece is a sealed pack, leave 8 to 10 % of its volume empty: water grows as it "
            "freezes and an overfilled pack bursts. Never use glass."
        )
    said.append(
        "Chillers, refrigerants, pressure and electrics belong to licensed engineers; machinery, food "
        "contact and labels are under local rules. This is an engineering estimate from the inputs stated, "
        "not a certificate."
    )
    return said


def _liquid(coldest_liquid: float) -> str:
    text = (
        "Cold brine or glycol freezes skin fast, and calcium chloride irritates skin and eyes: goggles and "
        "gloves. A leaking mould puts it into the food: propylene glycol and inhibitors of food-plant "
        "grade only."
    )
    if coldest_liquid < EUTECTIC:
        text += f" Plain salt brine (NaCl) cannot serve here: it freezes by itself at {EUTECTIC:g} degC."
    return text


def assumptions(contents: Contents) -> list[str]:
    """Return what the numbers take for granted, and what they do not cover."""
    case = contents.case
    said = []
    section = table(case, "piece").get("section")
    if section == "plane":
        said.append("A plane section: no heat along the length, so the ends are left out.")
    elif section == "axisymmetric":
        said.append("A body of revolution: the same all the way round.")
    materials = table(case, "materials")
    kinds = {m.get("kind") for m in materials.values() if isinstance(m, dict)}
    if "recipe" in kinds:
        said.append(
            "Ice by composition, at equilibrium: no supercooling, so freezing starts at its freezing point."
        )
    elif "melting" in kinds:
        said.append("One melting point: no mix of sugar and water has that, only water and the like.")
    said += [
        "Heat passes by conduction only: liquid in the piece stands still, which a mix with stabiliser "
        "nearly does.",
        "Mould and product touch without a gap; 0.024 mm of air between them costs 12 % more time in a 22 "
        "mm bar.",
        "Volume stays as filled: growth on freezing (6 to 8 %) is not followed.",
        "Not covered: flow of the coolant, stress and cracks, crystals in micrometres, drift of flavour, "
        "microbes.",
    ]
    aim = contents.summary["aim"]
    if aim is not None and -20.0 < aim["reach_degC"] <= -18.0:
        # Directive 89/108/EEC, article 1, leaves out ice cream and other edible ices.
        said.append(
            "-18 degC is customary here, not a law met: the EU's quick-frozen rules leave out edible ices."
        )
    return said


def checks(contents: Contents) -> list[str]:
    """Return what to look at in the plant before the answer is relied on.

    Where the run carried along what its time hangs on, its own numbers are said; else the trade's.
    """
    summary, case = contents.summary, contents.case
    met = [
        c for c in contacts(case) if c.exchange == "fluid" and c.coolant is not None and c.coolant[0] < 0.0
    ]
    said = _coolant(met, summary) + _coefficient(met, summary)
    if thickness := size(case):
        low, high = 100 * 0.5 / thickness, 200 * 0.5 / thickness
        usual = f"half a millimetre more takes {low:.0f} to {high:.0f} % more time"
        own = _cost(summary, ("thickness", "radius"), "more")
        said.append(f"Thickness by calliper: drawn as {thickness:g} mm; {own or usual}.")
    x, y = (1e3 * v for v in summary["slowest"]["at_m"][:2])
    said.append(
        f"Probe: its tip belongs at ({x:.1f}, {y:.1f}) mm. A tip 2 to 3 mm off reads cold too early; use "
        "two and believe the later one."
    )
    if (
        table(case, "piece").get("section") == "plane"
        and any(c.liquid for c in met)
        and not any("level" in caution for caution in summary["cautions"])
    ):
        said.append("Level: mix above the level of the coolant stays soft long after this section is hard.")
    if thin := _thin(summary):
        said.append(thin)
    return said


def _coolant(met: list[Contact], summary: dict[str, Any]) -> list[str]:
    temperatures = [c.coolant for c in met if c.coolant is not None]
    if not temperatures:
        return []
    own = _cost(summary, ("coolant",), "warmer")
    return [
        f"Coolant at the mould, not at the chiller: the case takes {_range(temperatures)} degC. Hang a "
        "loose probe between the moulds; 1 to 2 K off the log is usual" + (f", and {own}." if own else ".")
    ]


def _coefficient(met: list[Contact], summary: dict[str, Any]) -> list[str]:
    coefficients = [c.h for c in met if c.h is not None]
    if not coefficients:
        return []
    what = "Stirring" if any(c.liquid for c in met) else "Air speed"
    doubt = _cost(summary, ("h",), "less") or "seldom known better than by a factor of 1.5"
    return [
        f"{what}: the case takes h = {_range(coefficients)} W/m2/K; {doubt}. One logged run in the worst "
        "place settles it."
    ]


def _cost(summary: dict[str, Any], words: tuple[str, ...], which: str) -> str:
    """Say by how much later the aim is met at the bad end of an input, from the run; empty if not known.

    Of several inputs of one kind, as in stages, the one that costs most.
    """
    found = []
    for entry in (summary.get("uncertainty") or {}).get("inputs") or []:
        cost = known(entry["effect_of_less_s" if which == "less" else "effect_of_more_s"])
        if entry["key"].rsplit(".", 1)[-1] in words and cost is not None and cost > 0.0:
            found.append((cost, f"{entry['half_width']} {which} costs {error_text(cost)}"))
    return max(found, default=(0.0, ""))[1]


def _thin(summary: dict[str, Any]) -> str:
    aim = summary["aim"]
    if aim is None or aim["time_s"] is None or aim["within_s"] is None:
        return ""
    margin = 100.0 * (aim["within_s"] - aim["time_s"]) / aim["within_s"]
    if (spread := time_range(summary)) is not None:
        if margin < 0.0 or aim["within_s"] >= spread[1]:
            return ""
        late = duration(spread[1] - aim["within_s"])
        return f"Margin of {margin:.0f} %: the late end of the likely range misses the time given by {late}."
    if not 0.0 <= margin < 12.0:
        return ""
    return (
        f"The margin of {margin:.0f} % is less than 2 K of coolant can take away (about 12 % near -22 degC)."
    )


def _range(extents: list[tuple[float, float]]) -> str:
    low, high = min(e[0] for e in extents), max(e[1] for e in extents)
    return f"{low:.4g}" if low == high else f"{low:.4g} to {high:.4g}"


def _sentence(text: str) -> str:
    text = text.strip()
    return text[:1].upper() + text[1:] + ("" if text.endswith((".", "!", "?")) else ".")
