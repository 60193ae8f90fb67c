"""What a fit may look for: numbers of a case, by short words or by dotted keys."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fem.case.shift import Spread, kind_of, value_of
from fem.hangs_on import default_of
from fem.plan import Plan
from fem.quantity import Kind
from fem.sensitivity import Input, moved
from fem.signal import Signal
from fem.spread import name_of

# What acts through its inverse: a step in 1/x is straight where a step in x is not.
FURTHEST = (-1.5, 0.6)
FURTHEST_K = 1.0


@dataclass(frozen=True)
class Unknown:
    """A number that is fitted.

    Parameters
    ----------
    name
        In words.
    keys
        Dotted keys that all hold it.
    kind
        What sort of quantity it is.
    start
        What the case says, in the unit of its kind.
    stands
        Whether the user named it; else it came with a short word and may be left out again.

    """

    name: str
    keys: tuple[str, ...]
    kind: Kind
    start: float
    stands: bool = True

    @property
    def relative(self) -> bool:
        """Whether its steps are shares of itself; temperatures move by kelvins."""
        return self.kind.unit != "degC"

    def inputs(self) -> list[Input]:
        """Return what the times are differentiated to: one whole, or 1 K, of each key."""
        return [Input(key, Spread(1.0, self.relative), self.start) for key in self.keys]

    def stepped(self, value: float, step: float) -> float:
        """Return a value moved by a step of least squares, no further than it can be trusted."""
        if self.relative:
            return value / (1.0 - float(np.clip(step, *FURTHEST)))
        there = value + float(np.clip(step, -FURTHEST_K, FURTHEST_K))
        # A step may not lead past pure water, which no recipe is.
        return min(there, 0.5 * value) if self.keys[0].endswith(".freezing_point") else there

    def interval(self, value: float, half_width: float) -> tuple[float, float]:
        """Return the ends of an interval of so many wholes, or kelvins, to either side."""
        if not self.relative:
            return value - half_width, value + half_width
        return value / (1.0 + half_width), value / (1.0 - half_width) if half_width < 1.0 else np.inf

    def put(self, plan: Plan, value: float) -> Plan:
        """Return a case with the value in all its keys."""
        for entry in self.inputs():
            now = value_of(plan.case, entry.key)
            current = self.start if now is None else _steady(now)
            by = value / current - 1.0 if self.relative else value - current
            there = moved(plan, entry, by)
            assert there is not None, "what is fitted leaves the mesh as it is"
            plan = there
        return plan


def unknowns(plan: Plan, words: Sequence[str]) -> list[Unknown]:
    """Return what to fit.

    Parameters
    ----------
    plan
        The case made ready.
    words
        "h" (one for each stage), "freezing_point", "conductivity_factor", or dotted keys.

    Raises
    ------
    ValueError
        A word that means nothing here, or more than one thing.

    """
    found: list[Unknown] = []
    for word in words:
        if "." in word:
            found.append(_of_key(plan, word))
        elif word == "h":
            found += _coefficients(plan)
        elif word in ("freezing_point", "conductivity_factor"):
            found.append(_of_material(plan, word))
        else:
            known = "h, freezing_point, conductivity_factor or a dotted key"
            raise ValueError(f'"{word}" is nothing that can be fitted: {known}')
    keys = [key for unknown in found for key in unknown.keys]
    if len(set(keys)) < len(keys):
        raise ValueError(f"{', '.join(words)} names the same number twice")
    return found


def _coefficients(plan: Plan) -> list[Unknown]:
    """Return the heat transfer coefficient of each stage."""
    found = []
    for stage in plan.case.stages:
        values = {
            f"stages.{stage.name}.surfaces.{surface}.h": h
            for surface, exchange in stage.surfaces.items()
            if isinstance(h := getattr(exchange, "h", None), Signal)
        }
        if not values:
            continue
        if len({_steady(value) for value in values.values()}) > 1:
            raise ValueError(f"stage {stage.name} has more than one h; name one: {', '.join(values)}")
        keys = tuple(values)
        start = _steady(values[keys[0]])
        found.append(Unknown(f"h of stage {stage.name}", keys, kind_of(plan.case, keys[0]), start, False))
    if not found:
        raise ValueError("no stage of the case has an h")
    return found


def _of_material(plan: Plan, word: str) -> Unknown:
    names = dict.fromkeys(plan.case.regions[region] for region in plan.body.domain.product)
    keys = [f"materials.{n}.{word}" for n in names if hasattr(plan.case.materials[n], word)]
    if len(keys) != 1:
        listed = f"; name one: {', '.join(keys)}" if keys else ""
        raise ValueError(f"{len(keys)} materials of the product have a {word}{listed}")
    return _of_key(plan, keys[0])


def _of_key(plan: Plan, key: str) -> Unknown:
    kind = kind_of(plan.case, key)
    value = value_of(plan.case, key)
    start = default_of(plan, key) if value is None else _steady(value)
    if start is None:
        raise ValueError(f'"{key}" is left out of the case, and nothing says where to start from')
    if key.startswith(("shape.", "piece.length")):
        raise ValueError(f'"{key}" is measured with callipers, not fitted')
    word = key.rsplit(".", 1)[1]
    name = {"h": f"h ({key})", "conductivity_factor": "conductivity factor"}.get(word, name_of(key))
    return Unknown(name, (key,), kind, start)


def _steady(value: float | Signal) -> float:
    if not isinstance(value, Signal):
        return value
    if not value.constant:
        raise ValueError("what changes with time cannot be fitted by one number")
    return float(value.values[0])
