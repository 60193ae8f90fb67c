"""The plan of a sweep as it is written: a base case, what varies, limits, what is kept."""

from __future__ import annotations

import math
import re
from typing import Annotated, Any, Literal, Self

from pydantic import BaseModel, ConfigDict, Field, model_validator

from fem.errors import Problem, Refused

MOST_RUNS = 100_000
RESULTS = {
    "time_to_aim": ("s", "time to the aim"),
    "slowest": ("degC", "slowest point at the end"),
    "mean": ("degC", "equalised temperature at the end"),
    "heat_removed": ("J", "heat removed"),
    "ice_mean": ("-", "ice at the end"),
}
"""What a run answers with: its word, its unit in the table, and what it is."""

TAKEN = (*RESULTS, "run", "met", "passes", "outcome", "reason", "folder")
_NUMBER = re.compile(r"([-+\N{MINUS SIGN}]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)\s*(.*)")


def number_and_unit(raw: Any) -> tuple[float, str] | None:
    """Return a value's number and its unit as typed; None where it is no number.

    >>> number_and_unit("-22 degC"), number_and_unit(1.5), number_and_unit("stainless")
    ((-22.0, 'degC'), (1.5, ''), None)
    """
    if isinstance(raw, bool):
        return None
    if isinstance(raw, (int, float)):
        return (float(raw), "") if math.isfinite(raw) else None
    match = _NUMBER.fullmatch(raw.strip()) if isinstance(raw, str) else None
    return (float(match[1].replace("\N{MINUS SIGN}", "-")), match[2]) if match else None


class Variation(BaseModel):
    """One thing that varies: a key through a list or a range, or named sets of overrides.

    Parameters
    ----------
    key
        Dotted key of the case, stages and other named entries by their name.
    values
        List of values as the case would have them.
    from_, to
        Ends of a range, in the same unit.
    count
        How many values the range is cut into, its ends among them; left out where [sample] draws them.
    spacing
        Whether they lie evenly, or evenly in their logarithm.
    options
        Name -> overrides, each a quoted dotted key and its value: recipes, shapes, moulds.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    key: Annotated[str, Field(min_length=1)] | None = None
    values: list[Any] | None = None
    from_: Any = Field(default=None, alias="from")
    to: Any = None
    count: Annotated[int, Field(strict=True)] | None = None
    spacing: Literal["linear", "log"] = "linear"
    options: dict[str, dict[str, Any]] | None = None

    @model_validator(mode="after")
    def _is_one_of_three(self) -> Self:
        if found := self._wrong_form() or [*self._wrong_values(), *self._wrong_range()]:
            raise Refused(found)
        return self

    @property
    def sampled(self) -> bool:
        """Whether its values are drawn by the plan's [sample]."""
        return self.from_ is not None and self.count is None

    def _wrong_form(self) -> list[Problem]:
        ranged = self.from_ is not None or self.to is not None
        forms = [self.values is not None, ranged, self.options is not None]
        if sum(forms) != 1:
            told = "takes one of: values = [...]; from and to; options.NAME = { ... }"
            return [Problem("", told + ("; got none" if not any(forms) else "; got several"))]
        if self.options is None and self.key is None:
            return [Problem("key", 'is missing: the dotted key that varies, such as "shape.thickness"')]
        if self.options is not None and self.key is not None:
            return [Problem("key", "has no place beside options, which name their keys themselves")]
        loose = [] if ranged else [n for n in ("count", "spacing") if n in self.model_fields_set]
        return [Problem(name, "belongs to a range, from and to") for name in loose]

    def _wrong_values(self) -> list[Problem]:
        if self.options is not None:
            if not self.options:
                return [Problem("options", "is empty; give one set of overrides at least")]
            return [
                Problem(f"options.{name}", 'is empty; write "dotted.key" = value')
                for name, entry in self.options.items()
                if not entry
            ]
        if self.values is None:
            return []
        if not self.values:
            return [Problem("values", "is an empty list; give one value at least")]
        twice = [v for n, v in enumerate(self.values) if v in self.values[:n]]
        return [Problem("values", f"holds {v!r} twice") for v in twice[:1]]

    def _wrong_range(self) -> list[Problem]:
        if self.from_ is None and self.to is None:
            return []
        found, ends = [], []
        for name, raw in (("from", self.from_), ("to", self.to)):
            end = number_and_unit(raw)
            if raw is None:
                found.append(Problem(name, "is missing: a range has two ends"))
            elif end is None:
                found.append(
                    Problem(name, f'must be a number with its unit, such as "-22 degC", got {raw!r}')
                )
            else:
                ends.append(end)
        if self.count is not None and self.count < 2:
            found.append(Problem("count", f"must be at least 2, got {self.count}; for one value use values"))
        if self.count is not None and self.count > MOST_RUNS:
            found.append(Problem("count", f"must be at most {MOST_RUNS}, got {self.count}"))
        if len(ends) == 2:
            (low, unit), (high, other) = ends
            if unit != other:
                found.append(Problem("to", f'must be in the unit of from, "{unit}", got "{other}"'))
            elif low == high:
                found.append(Problem("to", "is the same as from"))
            elif self.spacing == "log" and (low <= 0 or high <= 0 or unit.endswith(("degC", "degF"))):
                found.append(Problem("spacing", "must be linear: a logarithm needs amounts above 0"))
        return found


class Sample(BaseModel):
    """How the ranges without a count are drawn, all together.

    Parameters
    ----------
    method
        Latin hypercube, or a scrambled Sobol sequence.
    count
        How many draws; of a Sobol sequence a power of two.
    seed
        Makes the draws the same each time.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    method: Literal["latin hypercube", "sobol"]
    count: Annotated[int, Field(strict=True, ge=2, le=MOST_RUNS)]
    seed: Annotated[int, Field(strict=True, ge=0)] = 1

    @model_validator(mode="after")
    def _balanced(self) -> Self:
        if self.method == "sobol" and self.count & (self.count - 1):
            below = 1 << (self.count.bit_length() - 1)
            told = f"must be a power of two for sobol, {below} or {2 * below}, got {self.count}"
            raise Refused([Problem("count", told)])
        return self


class Limit(BaseModel):
    """What a result, or a varied value, has to stay within.

    Parameters
    ----------
    least, most
        With their unit.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    least: Any = None
    most: Any = None

    @model_validator(mode="after")
    def _says_something(self) -> Self:
        if self.least is None and self.most is None:
            raise Refused([Problem("", "takes least, most or both")])
        return self


class Keep(BaseModel):
    """What the folder of each run keeps and carries, beside its case and summary.

    Parameters
    ----------
    curves
        Curves, fronts and log.
    fields
        Fields, as the case has them.
    reports
        A page for each run.
    ranges
        The range of each answer and what it hangs on; costs a fifth of a run.
    numerical_error
        The run compared with a coarse twin; costs a fifth of a run.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    curves: Annotated[bool, Field(strict=True)] = True
    fields: Annotated[bool, Field(strict=True)] = False
    reports: Annotated[bool, Field(strict=True)] = False
    ranges: Annotated[bool, Field(strict=True)] = False
    numerical_error: Annotated[bool, Field(strict=True)] = False


class Variations(BaseModel):
    """The file of a plan.

    Parameters
    ----------
    plan_schema
        Version of this language, 1.
    title
        What is asked.
    case
        The base case's file, looked for beside the plan.
    set_
        Overrides of every run: quoted dotted key and value.
    vary
        What varies, by name; the names head columns of the table.
    together
        Groups of names whose values are walked side by side and not crossed.
    sample
        How ranges without a count are drawn.
    limits
        By the word of a result or the name of what varies.
    keep
        What each run keeps.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    plan_schema: Annotated[Literal[1], Field(alias="schema")]
    title: str = ""
    case: Annotated[str, Field(min_length=1)]
    set_: Annotated[dict[str, Any], Field(alias="set")] = {}
    vary: dict[str, Variation]
    together: list[list[str]] = []
    sample: Sample | None = None
    limits: dict[str, Limit] = {}
    keep: Keep = Keep()
