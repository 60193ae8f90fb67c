"""What a case says of the piece and what it meets, as far as the text in a run folder can be read."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from pydantic_core import PydanticCustomError

from fem.quantity import COEFFICIENT, LENGTH, TEMPERATURE, Kind

# Below this no still or moving air goes: what cools is a liquid.
LIQUID = 80.0


@dataclass(frozen=True)
class Contact:
    """What one surface meets in one stage.

    Parameters
    ----------
    stage, surface, exchange
        Names as the case has them.
    coolant
        Lowest and highest temperature of fluid, wall or surroundings [degC]; None where not given.
    h
        Lowest and highest heat transfer coefficient [W/m2/K]; None where not given.

    """

    stage: str
    surface: str
    exchange: str
    coolant: tuple[float, float] | None
    h: tuple[float, float] | None

    @property
    def liquid(self) -> bool:
        """Whether a cold liquid must be at work."""
        return self.exchange == "fluid" and self.h is not None and self.h[1] >= LIQUID


def contacts(case: dict[str, Any]) -> list[Contact]:
    """Return what every surface meets in every stage; what cannot be read is left out."""
    found = []
    stages = case.get("stages")
    for stage in stages if isinstance(stages, list) else []:
        surfaces = table(stage, "surfaces")
        for surface, entry in surfaces.items():
            if not isinstance(entry, dict):
                continue
            around = next(
                (entry[k] for k in ("coolant", "temperature", "surroundings", "air") if k in entry), None
            )
            found.append(
                Contact(
                    str(stage.get("name", "")),
                    surface,
                    str(entry.get("exchange", "")),
                    _extent(around, TEMPERATURE),
                    _extent(entry.get("h"), COEFFICIENT),
                )
            )
    return found


def is_axisymmetric(case: dict[str, Any]) -> bool:
    """Return whether a case's coordinates are (r, z)."""
    return bool(table(case, "piece").get("section") == "axisymmetric")


def freezing_regions(case: dict[str, Any]) -> set[str]:
    """Return the regions whose material can freeze."""
    materials = table(case, "materials")
    return {
        region
        for region, name in table(case, "regions").items()
        if isinstance(name, str) and table(materials, name).get("kind") not in (None, "plain")
    }


def size(case: dict[str, Any]) -> float | None:
    """Return the size across which the heat goes [mm], where the shape states one."""
    shape = table(case, "shape")
    factor = {"thickness": 1e3, "radius": 2e3}
    for key, scale in factor.items():
        extent = _extent(shape.get(key), LENGTH)
        if extent is not None and extent[1] < 0.5:
            return float(f"{scale * extent[1]:.4g}")
    return None


def _extent(raw: Any, kind: Kind) -> tuple[float, float] | None:
    """Return the lowest and highest value of a signal as a case writes it."""
    try:
        if isinstance(raw, dict):
            column = table(raw, "value")
            values = column.get("values")
            if not isinstance(values, list) or not values:
                return None
            read = [kind.read(f"{v} {column.get('unit', '')}") for v in values]
            return min(read), max(read)
        value = kind.read(raw)
    except PydanticCustomError:
        return None
    return value, value


def table(tables: Any, key: str) -> dict[str, Any]:
    """Return a table of a table; empty where it is none."""
    found = tables.get(key) if isinstance(tables, dict) else None
    return found if isinstance(found, dict) else {}
