"""The dimensions of a sweep: what is crossed with what, and every run that comes of it."""

from __future__ import annotations

import itertools
import json
import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from fem.case.wording import Note
from fem.errors import unknown
from fem.series.variations import MOST_RUNS, Sample, Variation, Variations, number_and_unit


@dataclass(frozen=True)
class Choice:
    """One setting of one thing that varies.

    Parameters
    ----------
    label
        What the table says: text with its unit, or the name of an option.
    overrides
        Dotted key -> value, as TOML has it.

    """

    label: Any
    overrides: Mapping[str, Any]


@dataclass(frozen=True)
class Axis:
    """Things that vary together, and their settings side by side.

    Parameters
    ----------
    names
        Of what varies.
    rows
        For each step along the axis one choice per name.

    """

    names: tuple[str, ...]
    rows: tuple[tuple[Choice, ...], ...]


def axes_of(plan: Variations, found: list[Note]) -> list[Axis]:
    """Return the dimensions that a plan spans, in the order of the file.

    Parameters
    ----------
    plan
        As written.
    found
        Takes what is wrong.

    """
    groups = _groups(plan, found)
    drawn = [name for name, variation in plan.vary.items() if variation.sampled]
    _check_sample(plan, drawn, groups, found)
    total = math.prod(_length(plan, group) for group in groups if not set(group) & set(drawn))
    total *= plan.sample.count if plan.sample and drawn else 1
    if total > MOST_RUNS:
        found.append(Note(("vary",), f"makes {total} runs; a sweep has {MOST_RUNS} at most"))
    if found:
        return []
    axes, sampled = [], False
    for group in groups:
        if group[0] not in drawn:
            axes.append(Axis(group, tuple(zip(*(choices(plan.vary[n]) for n in group), strict=True))))
        elif not sampled:
            assert plan.sample is not None
            axes.append(_draw({name: plan.vary[name] for name in drawn}, plan.sample))
            sampled = True
    return axes


def _groups(plan: Variations, found: list[Note]) -> list[tuple[str, ...]]:
    """Return the names of each axis; one that stands in no group is its own."""
    grouped: dict[str, tuple[str, ...]] = {}
    for number, group in enumerate(plan.together):
        place = ("together", number)
        wrong = [name for name in group if name not in plan.vary]
        found += [Note(place, unknown("thing that varies", name, plan.vary)) for name in wrong]
        if len(set(group)) < 2:
            found.append(Note(place, "names two things that vary at least"))
        found += [
            Note(place, f'"{name}" stands in two groups') for name in dict.fromkeys(group) if name in grouped
        ]
        lengths = {name: _length(plan, (name,)) for name in group if name not in wrong}
        if not wrong and len(set(lengths.values())) > 1:
            said = ", ".join(f"{name} has {count}" for name, count in lengths.items())
            found.append(Note(place, f"lists walked side by side are of one length: {said}"))
        grouped |= dict.fromkeys((n for n in group if n not in wrong), tuple(dict.fromkeys(group)))
    return list(dict.fromkeys(grouped.get(name, (name,)) for name in plan.vary))


def _check_sample(
    plan: Variations, drawn: list[str], groups: list[tuple[str, ...]], found: list[Note]
) -> None:
    if drawn and plan.sample is None:
        for name in drawn:
            found.append(Note(("vary", name), "is a range without count: give it one, or open [sample]"))
    if plan.sample is not None and not drawn:
        found.append(Note(("sample",), "has nothing to draw: leave out the count of the ranges it is for"))
    for group in groups:
        if len(group) > 1 and set(group) & set(drawn):
            number = next(n for n, names in enumerate(plan.together) if set(names) == set(group))
            found.append(Note(("together", number), "holds a range without count; samples are drawn at once"))


def _length(plan: Variations, group: tuple[str, ...]) -> int:
    variation = plan.vary[group[0]] if group[0] in plan.vary else Variation.model_construct(values=[0])
    if variation.options is not None:
        return len(variation.options)
    return len(variation.values) if variation.values is not None else variation.count or 1


def choices(variation: Variation) -> list[Choice]:
    """Return every setting of a list, of a range that is cut, or of named options."""
    if variation.options is not None:
        return [Choice(name, overrides) for name, overrides in variation.options.items()]
    assert variation.key is not None
    values = variation.values
    if values is None:
        assert variation.count is not None
        values = _between(variation, np.linspace(0.0, 1.0, variation.count))
    return [Choice(value, {variation.key: value}) for value in values]


def _draw(drawn: Mapping[str, Variation], sample: Sample) -> Axis:
    from scipy.stats import qmc

    if sample.method == "sobol":
        shares = qmc.Sobol(len(drawn), rng=sample.seed).random_base2(sample.count.bit_length() - 1)
    else:
        shares = qmc.LatinHypercube(len(drawn), rng=sample.seed).random(sample.count)
    columns = []
    for share, variation in zip(shares.T, drawn.values(), strict=True):
        assert variation.key is not None
        columns.append([Choice(v, {variation.key: v}) for v in _between(variation, share)])
    return Axis(tuple(drawn), tuple(zip(*columns, strict=True)))


def _between(variation: Variation, shares: np.ndarray) -> list[Any]:
    """Return the values at shares of a range, written in its own unit to six figures."""
    ends = [end for end in map(number_and_unit, (variation.from_, variation.to)) if end is not None]
    (low, unit), (high, _) = ends
    if variation.spacing == "log":
        numbers = np.exp(np.log(low) + shares * (np.log(high) - np.log(low)))
    else:
        numbers = low + shares * (high - low)
    whole = isinstance(variation.from_, int) and isinstance(variation.to, int)
    return [_written(float(number), unit, whole) for number in numbers]


def _written(number: float, unit: str, whole: bool) -> Any:
    rounded = float(f"{number:.6g}")
    if unit:
        return f"{rounded:.6g} {unit}"
    return int(rounded) if whole and rounded.is_integer() else rounded


@dataclass(frozen=True)
class Point:
    """One run of a sweep.

    Parameters
    ----------
    number
        Counted from 1, in the order of the plan.
    labels
        Name of what varies -> its setting.
    overrides
        Each ``key=value``; those of whole tables before those of their keys.

    """

    number: int
    labels: dict[str, Any]
    overrides: tuple[str, ...]


def points(axes: list[Axis]) -> Iterator[Point]:
    """Yield every run, the first axis changing slowest."""
    names = [name for axis in axes for name in axis.names]
    for number, steps in enumerate(itertools.product(*(axis.rows for axis in axes)), start=1):
        picked = [choice for step in steps for choice in step]
        overrides = overrides_of({k: v for choice in picked for k, v in choice.overrides.items()})
        yield Point(number, dict(zip(names, (c.label for c in picked), strict=True)), tuple(overrides))


def overrides_of(settings: Mapping[str, Any]) -> list[str]:
    """Return settings as overrides, shorter keys first: a table before what is changed in it."""
    ordered = sorted(settings.items(), key=lambda item: item[0].count("."))
    return [f"{key}={toml(value)}" for key, value in ordered]


def toml(value: Any) -> str:
    """Write a value in one line of TOML.

    >>> toml({"kind": "recipe", "sucrose": "18 %", "n": [1, 2.5, True]})
    '{"kind" = "recipe", "sucrose" = "18 %", "n" = [1, 2.5, true]}'
    """
    if isinstance(value, dict):
        return "{" + ", ".join(f"{toml(k)} = {toml(v)}" for k, v in value.items()) + "}"
    if isinstance(value, (list, tuple)):
        return "[" + ", ".join(map(toml, value)) + "]"
    if isinstance(value, (bool, str)):
        return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f")
    return repr(value) if isinstance(value, (int, float)) else str(value)
