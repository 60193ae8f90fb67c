"""A plan of a sweep read and checked as a whole, its base with it, before anything runs."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from fem.case.case import Case
from fem.case.locate import KeyPath, dotted, line_of, lines, split
from fem.case.read import load, loads, text_of, tree_of
from fem.case.wording import Note, notes, one_line
from fem.errors import CaseError, Problem, unknown
from fem.plan import Plan as Prepared
from fem.quantity import DURATION, SHARE, TEMPERATURE, Kind
from fem.series.axes import Axis, Choice, Point, axes_of, overrides_of, points
from fem.series.variations import RESULTS, TAKEN, Keep, Limit, Variation, Variations, number_and_unit

KINDS = {
    "time_to_aim": DURATION,
    "slowest": TEMPERATURE,
    "mean": TEMPERATURE,
    "heat_removed": Kind("heat", "J", "28 kJ"),
    "ice_mean": SHARE,
}
# Each value is read in the base by itself, at some 5 ms; of a longer plan only so many are.
MOST_TRIED = 400
NO_FIELDS = 'watch.fields="none"'


@dataclass(frozen=True)
class SweepPlan:
    """A plan that can be run.

    Parameters
    ----------
    title
        What is asked.
    base
        The case that varies, the overrides of every run applied.
    axes
        What varies.
    vary
        The same by name, as written.
    limits
        Word of a result or name of what varies -> least and most, -inf and inf where there is
        none; in the unit of the table.
    keep
        What each run keeps.
    text, source
        The plan as written, and its name.

    """

    title: str
    base: Case
    axes: tuple[Axis, ...]
    vary: dict[str, Variation]
    limits: dict[str, tuple[float, float]]
    keep: Keep
    text: str = field(repr=False)
    source: str

    @property
    def runs(self) -> int:
        """How many runs it makes."""
        return math.prod(len(axis.rows) for axis in self.axes)

    def points(self) -> Iterator[Point]:
        """Yield its runs in their order."""
        return points(list(self.axes))

    def case_of(self, point: Point) -> Case:
        """Return the case of a run.

        Raises
        ------
        CaseError
            Where its settings do not go together.

        """
        return loads(self.base.text, self.base.source, self.base.folder, point.overrides)

    def unit_of(self, name: str) -> str | None:
        """Return the unit that all settings share; empty for bare numbers, None where there is none."""
        return _unit_of(self.axes, name)


def read_plan(path: str | Path) -> SweepPlan:
    """Read a plan.

    Parameters
    ----------
    path
        A TOML file; the base that it names is looked for beside it.

    Raises
    ------
    CaseError
        Every problem of the plan; where there is none, those of its base.

    """
    text, source = text_of(path), str(path)
    tree = tree_of(text, source)
    found: list[Note] = []
    # A plan has no other table without which the rest cannot be judged.
    try:
        plan = Variations.model_validate(tree)
    except ValidationError as error:
        raise CaseError(source, _placed(list(notes(error, Variations, ())), tree, text)) from error
    _check_names(plan, found)
    axes = axes_of(plan, found)
    limits = _limits(plan, axes, found) if axes else {}
    base, broken = _base(plan, Path(path).parent, found)
    if base is not None and axes:
        found += _tried(base, axes)
    if found:
        if broken is not None:
            first = broken.problems[0].message
            told = f"does not read either: {len(broken.problems)} problem(s), first: {first}"
            found.append(Note(("case",), told))
        raise CaseError(source, _placed(found, tree, text))
    if broken is not None:
        raise broken
    assert base is not None
    title = plan.title or base.title
    return SweepPlan(title, base, tuple(axes), plan.vary, limits, plan.keep, text, source)


def _check_names(plan: Variations, found: list[Note]) -> None:
    if not plan.vary:
        found.append(Note(("vary",), "is empty; open [vary.NAME] for each thing that varies"))
    owners: dict[str, str] = {}
    for key in plan.set_:
        _check_key(key, ("set", key), found)
        owners[key] = "set"
    for name, variation in plan.vary.items():
        if name in TAKEN:
            found.append(Note(("vary", name), f'"{name}" heads a column of results; choose another name'))
        if not name.replace("-", "").replace("_", "").isalnum():
            found.append(
                Note(("vary", name), "a name is made of letters, digits, _ and -; it heads a column")
            )
        keys = {k for entry in (variation.options or {}).values() for k in entry}
        keys |= {variation.key} if variation.key is not None else set()
        for key in sorted(keys):
            place = ("vary", name, "key" if variation.key else "options")
            _check_key(key, place, found)
            if key in owners:
                other = owners[key]
                said = "by [set] and here" if other == "set" else f'by "{other}" and here'
                found.append(Note(place, f"{key} is set twice, {said}"))
            owners[key] = name
    if plan.keep.reports and not plan.keep.fields:
        found.append(Note(("keep", "reports"), "needs fields = true: a report without maps is half of one"))
    for key in {"watch.fields", "schema"} & set(owners):
        found.append(Note(("keep",), f"{key} is not for a plan to set; [keep] says what is kept"))


def _check_key(key: str, place: KeyPath, found: list[Note]) -> None:
    try:
        split(key)
    except ValueError as error:
        found.append(Note(place, one_line(str(error))))


def _limits(plan: Variations, axes: list[Axis], found: list[Note]) -> dict[str, tuple[float, float]]:
    out = {}
    for name, limit in plan.limits.items():
        place = ("limits", name)
        if name in RESULTS:
            ends = _read_ends(limit, KINDS[name], place, found)
            out[name] = tuple(x / 100.0 for x in ends) if name == "ice_mean" else ends
        elif name in plan.vary:
            out[name] = _ends_in(limit, _unit_of(axes, name), place, found)
        else:
            told = unknown("result or thing that varies", name, [*RESULTS, *plan.vary])
            found.append(Note(place, told))
            continue
        if out[name][0] > out[name][1]:
            found.append(Note(place, "has a least above its most: nothing can pass"))
    return out  # type: ignore[return-value]


def _read_ends(limit: Limit, kind: Kind, place: KeyPath, found: list[Note]) -> tuple[float, float]:
    ends = [-math.inf, math.inf]
    for n, (word, raw) in enumerate((("least", limit.least), ("most", limit.most))):
        if raw is not None:
            try:
                ends[n] = kind.read(raw)
            except ValueError as error:
                found.append(Note((*place, word), one_line(str(error))))
    return ends[0], ends[1]


def _ends_in(limit: Limit, unit: str | None, place: KeyPath, found: list[Note]) -> tuple[float, float]:
    ends = [-math.inf, math.inf]
    for n, (word, raw) in enumerate((("least", limit.least), ("most", limit.most))):
        if raw is None:
            continue
        read = number_and_unit(raw)
        if unit is None or read is None or read[1] != unit:
            told = (
                f'must be a number in "{unit}", as its values are' if unit is not None else "has no numbers"
            )
            found.append(Note((*place, word), f"{told}, got {raw!r}"))
        else:
            ends[n] = read[0]
    return ends[0], ends[1]


def _unit_of(axes: list[Axis] | tuple[Axis, ...], name: str) -> str | None:
    axis = next(axis for axis in axes if name in axis.names)
    at = axis.names.index(name)
    read = [number_and_unit(row[at].label) for row in axis.rows]
    units = {r[1] if r else None for r in read}
    return units.pop() if len(units) == 1 else None


def _base(plan: Variations, folder: Path, found: list[Note]) -> tuple[Case | None, CaseError | None]:
    """Read the base with what every run sets; what [set] got wrong is the plan's mistake."""
    overrides = overrides_of(plan.set_) + ([] if plan.keep.fields else [NO_FIELDS])
    try:
        base = load(folder / plan.case, overrides)
        # What only shows once the piece is meshed would show in every run.
        Prepared.of(base).record()
        return base, None
    except CaseError as error:
        mine = [(p, key) for p in error.problems for key in plan.set_ if _concerns(p, key)]
        found += [Note(("set", key), _bare(p)) for p, key in mine]
        return None, None if mine else error


def _tried(base: Case, axes: list[Axis]) -> Iterator[Note]:
    """Read the base with each setting by itself; yield what is wrong with the setting as such.

    What does not go together with the rest of a case is a matter of that one run.
    """
    every = [
        (axis.names[n], choice)
        for axis in axes
        for n in range(len(axis.names))
        for choice in dict.fromkeys(_Once(row[n]) for row in axis.rows)
    ]
    stride = max(1, math.ceil(len(every) / MOST_TRIED))
    said = set()
    for name, once in itertools.islice(every, None, None, stride):
        try:
            loads(base.text, base.source, base.folder, overrides_of(once.choice.overrides))
        except CaseError as error:
            for p in error.problems:
                keys = [key for key in once.choice.overrides if _concerns(p, key)]
                note = Note(("vary", name), one_line(f"{p.place.removeprefix('--set ')}: {_bare(p)}"))
                if keys and note not in said:
                    said.add(note)
                    yield note


class _Once:
    """A choice that is equal to another one which sets the same."""

    def __init__(self, choice: Choice):
        self.choice = choice
        self._said = tuple(overrides_of(choice.overrides))

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Once) and self._said == other._said

    def __hash__(self) -> int:
        return hash(self._said)


def _concerns(problem: Problem, key: str) -> bool:
    """Say whether a problem of a case stands where an override has put something."""
    place = problem.place.removeprefix("--set ")
    return problem.line is None and (place == key or place.startswith(f"{key}."))


def _bare(problem: Problem) -> str:
    return problem.message.removesuffix(" (--set)")


def _placed(found: list[Note], tree: dict[str, Any], text: str) -> list[Problem]:
    known = lines(text)
    return [Problem(dotted(n.path, tree), n.message, line_of(n.path, known)) for n in dict.fromkeys(found)]
