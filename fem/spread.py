"""From derivatives to a range: how wide the honest answer is, and which knob matters most."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from fem.curve import Array
from fem.sensitivity import Input

# Half-width of 19 in 20 of a normal distribution, in standard deviations.
HALF_WIDTH = 1.959964
SAMPLES = 20_000
# Beyond this share of what drives the heat an input bends the answer too much for its tangent.
BENDS = 0.5


@dataclass(frozen=True)
class Bend:
    """The variable in which the time is straight, for one input.

    Parameters
    ----------
    share
        Half-width as a share of what the time is inversely proportional to: h itself, or the
        difference between freezing point and coolant. None where the input itself will do.
    sign
        1 where a larger input makes what drives the heat larger, else -1.

    """

    share: float | None = None
    sign: float = 1.0

    def effect(self, slope: float, by: Array) -> Array:
        """Return the change of a time that falls with 1/x for moves in half-widths.

        `slope` is the change per half-width at the value itself; the inverse has the same one.
        """
        if self.share is None:
            return slope * by
        x = np.maximum(1.0 + self.sign * self.share * by, 0.05)
        return np.asarray(-self.sign * slope / self.share * (1.0 / x - 1.0))


@dataclass(frozen=True)
class Range:
    """An answer and the interval that it lies in 19 times out of 20."""

    low: float
    likely: float
    high: float

    def as_dict(self) -> dict[str, float]:
        """Return the range for JSON."""
        return {"low": self.low, "likely": self.likely, "high": self.high}


def range_of(likely: float, slopes: Array, bends: Sequence[Bend]) -> Range:
    """Return the range of an answer whose inputs vary independently, each normally.

    Parameters
    ----------
    likely
        The answer itself.
    slopes
        Its change per half-width of each input, shape (m,).
    bends
        How each is straightened.

    """
    known = np.nan_to_num(slopes)
    # The same numbers for every run: a case gives the same range wherever it is run.
    draws = np.random.default_rng(19).standard_normal((SAMPLES, len(known))) / HALF_WIDTH
    draws = np.concatenate([draws, -draws])
    total = np.full(len(draws), likely)
    for i, bend in enumerate(bends):
        total += bend.effect(float(known[i]), draws[:, i])
    low, high = np.percentile(total, [2.5, 97.5])
    return Range(float(low), likely, float(high))


def bends_of(
    inputs: Sequence[Input], values: Sequence[float | None], freezing_point: float | None
) -> list[Bend]:
    """Return how the time depends on each input on the large.

    A heat transfer coefficient acts through its inverse, a coolant through the inverse of its
    distance from the freezing point (Plank's form); everything else is straight enough.
    """
    out = []
    for entry, value in zip(inputs, values, strict=True):
        word = entry.key.rsplit(".", 1)[1]
        size = entry.spread.size
        if word == "h" and value:
            out.append(Bend(size if entry.spread.relative else size / value))
        elif (
            word in ("coolant", "surroundings", "temperature")
            and value is not None
            and freezing_point is not None
        ):
            amount = size * abs(value) if entry.spread.relative else size
            drive = freezing_point - value
            out.append(Bend(amount / abs(drive), -1.0 if drive > 0 else 1.0) if drive else Bend())
        else:
            out.append(Bend())
    return out


def ranking(
    inputs: Sequence[Input], slopes: Array, bends: Sequence[Bend], values: Sequence[float | None]
) -> list[dict[str, Any]]:
    """Return the inputs, the most important first: key, half-width, its effects and plain words."""
    ends = [
        [float(b.effect(float(s), np.array(by))) for by in (-1.0, 1.0)]
        for s, b in zip(slopes, bends, strict=True)
    ]
    # By the width between both ends, which is what a reader sees: a slope alone leaves out the bend.
    order = np.argsort([-abs(high - low) for low, high in np.nan_to_num(ends)], kind="stable")
    out = []
    for i in order:
        entry, slope, (low, high) = inputs[i], float(slopes[i]), ends[i]
        out.append(
            {
                "key": entry.key,
                "name": name_of(entry.key, values[i]),
                "half_width": said(entry),
                "effect_of_less_s": low,
                "effect_of_more_s": high,
                "words": words(entry, slope, name_of(entry.key, values[i])),
            }
        )
    return out


NAMES = {
    "h": "agitation",
    "coolant": "coolant temperature",
    "surroundings": "room temperature",
    "temperature": "surface temperature",
    "air": "air temperature",
    "thickness": "thickness",
    "width": "width",
    "radius": "radius",
    "outer": "outer radius",
    "wall": "wall thickness",
    "conductivity_factor": "conductivity",
    "freezing_point": "freezing point",
    "start_temperature": "fill temperature",
    "lasts": "length of the stage",
    "density": "density",
}


# A film below this is air's: a liquid coolant that is stirred at all does better [W/m2/K].
AIR = 80.0


def name_of(key: str, value: float | None = None) -> str:
    """Return what an input is called in a sentence; what moves h depends on its size."""
    word = key.rsplit(".", 1)[1]
    if word == "h" and value is not None and value < AIR:
        return "air speed"
    return NAMES.get(word, word.replace("_", " "))


def said(entry: Input) -> str:
    """Return a half-width in words."""
    if entry.spread.relative:
        return f"{100 * entry.spread.size:.3g} %"
    unit, factor = _unit(entry.key)
    return f"{entry.spread.size * factor:.3g} {unit}"


def words(entry: Input, slope: float, name: str) -> str:
    """Return what a round step of an input buys or costs, in plain words."""
    step, text, by = _round_step(entry, name)
    change = slope * by
    more = "buys" if change < 0 else "costs"
    if abs(change) < 0.05:
        return f"{step} of {name} hardly matter"
    return (
        f"{text} {more} {abs(change):.0f} s" if abs(change) >= 10.0 else f"{text} {more} {abs(change):.2g} s"
    )


def _round_step(entry: Input, name: str) -> tuple[str, str, float]:
    """Return a round step, its sentence, and how many half-widths it is."""
    if entry.spread.relative:
        return "10 %", f"10 % more {name}", 0.10 / entry.spread.size
    unit, factor = _unit(entry.key)
    size = 1.0 if unit in ("K", "mm") else entry.spread.size * factor
    if name == "freezing point":
        return "0.1 K", "0.1 K lower freezing point", -0.1 / entry.spread.size
    if unit == "K":
        return "1 K", f"1 K colder {name.removesuffix(' temperature')}", -1.0 / entry.spread.size
    return f"{size:.3g} {unit}", f"{size:.3g} {unit} more {name}", size / (entry.spread.size * factor)


def _unit(key: str) -> tuple[str, float]:
    """Return the unit that a half-width is said in, and the factor from SI."""
    word = key.rsplit(".", 1)[1]
    if word in ("thickness", "width", "radius", "outer", "inner", "wall", "corner", "height", "length"):
        return "mm", 1e3
    if word in ("coolant", "surroundings", "temperature", "air", "freezing_point", "start_temperature"):
        return "K", 1.0
    if key.startswith("piece.start"):
        return "K", 1.0
    return {"h": "W/m2/K", "lasts": "s", "density": "kg/m3", "conductivity": "W/m/K"}.get(word, ""), 1.0
