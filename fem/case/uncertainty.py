"""Which inputs of a case are uncertain, and by how much: as the case says, or as the trade knows them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pydantic_core import PydanticCustomError

from fem.case.case import Case
from fem.case.shift import Spread, kind_of, read_spread
from fem.case.wording import Note, shown

# How well inputs are known in the trade, 19 times out of 20. Common practice, no source: agitation
# by hand is known to a factor, the logged coolant is not the one at the mould, recipes miss acids.
USUAL = {
    "h": Spread(0.30, relative=True),
    "coolant": Spread(1.5, relative=False),
    "surroundings": Spread(1.5, relative=False),
    "thickness": Spread(0.5e-3, relative=False),
    "radius": Spread(0.25e-3, relative=False),
    "outer": Spread(0.25e-3, relative=False),
    "conductivity_factor": Spread(0.15, relative=True),
    "freezing_point": Spread(0.2, relative=False),
}


def read_uncertainty(case: Case, raw: Any, found: list[Note]) -> dict[str, Spread]:
    """Read the table ``[uncertainty]``: dotted key -> half-width.

    Parameters
    ----------
    case
        The rest of the case, without a problem.
    raw
        The table as it stands.
    found
        Takes what is wrong.

    """
    if not isinstance(raw, dict):
        found.append(Note(("uncertainty",), f"is a table of keys and half-widths, got {shown(raw)}"))
        return {}
    out = {}
    for key, text in raw.items():
        place = ("uncertainty", key)
        if isinstance(text, dict):
            found.append(Note(place, f'write the dotted key in quotes: "{key}. ... " = "10 %"'))
            continue
        try:
            out[key] = read_spread(text, kind_of(case, key))
        except (PydanticCustomError, ValueError) as error:
            said = error.message() if isinstance(error, PydanticCustomError) else str(error)
            found.append(Note(place, said))
    return out


def usual_uncertainty(case: Case, product: Mapping[str, str]) -> dict[str, Spread]:
    """Return what the trade does not know of a case that says nothing itself.

    Parameters
    ----------
    case
        As read.
    product
        Product region -> material.

    """
    keys = [
        f"stages.{stage.name}.surfaces.{surface}.{name}"
        for stage in case.stages
        for surface, exchange in stage.surfaces.items()
        for name in ("h", "coolant", "surroundings")
        if getattr(exchange, name, None) is not None
    ]
    keys += [f"shape.{name}" for name in ("thickness", "radius", "outer") if hasattr(case.shape, name)]
    for name in dict.fromkeys(product.values()):
        material = case.materials[name]
        keys += [
            f"materials.{name}.{key}"
            for key in ("conductivity_factor", "freezing_point")
            if hasattr(material, key)
        ]
    return {
        key: USUAL[key.rsplit(".", 1)[1]]
        for key in keys
        if not key.endswith(".freezing_point") or _moves(case, key)
    }


def _moves(case: Case, key: str) -> bool:
    """Whether the freezing point of a material is one that can be moved: a table's rows are as given."""
    return case.materials[key.split(".")[1]].kind == "recipe"
