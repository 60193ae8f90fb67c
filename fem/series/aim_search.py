"""A root search for the time to the aim, that keeps its bracket and uses the runs' tangents."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from fem.case.case import Case
from fem.case.read import loads
from fem.case.shift import Spread, value_of
from fem.case.uncertainty import usual_uncertainty
from fem.plan import Plan
from fem.quantity import Kind
from fem.result.answer import duration
from fem.run import run
from fem.sensitivity import Input, moved
from fem.signal import Signal
from fem.spread import name_of

WITHIN_K = 0.04
WITHIN_SHARE = 2e-3
"""How close to the true value the answer is, in kelvins or as a share of it."""
MARGIN_SHARE = 0.01
"""How close to the time given the unfavourable end has to come: no range is known better."""
HAIR = 1e-3  # half-width of the input whose derivative is wanted where nothing says it [K or share]
MOST_RUNS = 30
DIGITS = 5  # of a value that is tried; nobody sets a bath closer

Progress = Callable[[str], None]


@dataclass(frozen=True)
class Trial:
    """One run of the search.

    Parameters
    ----------
    value
        Of the input, in the unit of its kind.
    time
        To the aim [s]: the likely one, or with margin the unfavourable end of its range; None
        where the stages end before.
    slope
        Its derivative to the value; None where the run does not say.

    """

    value: float
    time: float | None
    slope: float | None


class AimSearch:
    """Trials on either side of the aim, and where to try next.

    Parameters
    ----------
    case
        It has an aim with a time.
    key, kind
        What is varied, and what sort of quantity it is.
    ends
        Of the interval, in the unit of the kind.
    with_margin
        Whether the unfavourable end of the time's range has to meet the aim.
    progress
        Called with a sentence before each run.

    """

    def __init__(
        self,
        case: Case,
        key: str,
        kind: Kind,
        ends: tuple[float, float],
        with_margin: bool,
        progress: Progress,
    ):
        assert case.aim is not None
        assert case.aim.within is not None
        self.case, self.key, self.kind, self.ends = case, key, kind, ends
        self.with_margin, self.progress = with_margin, progress
        self.within = case.aim.within
        self.trials: list[Trial] = []
        self._width = np.inf
        self.bend = Bend.of(case, key, ends)

    def find(self) -> tuple[float | None, str]:
        """Return the value and a sentence."""
        value = self._first()
        while len(self.trials) < MOST_RUNS:
            trial = self._run(value)
            if self._close(trial):
                return trial.value, self._said(trial)
            inner = self._bracket()
            if inner is None:
                untried = [end for end in self.ends if all(t.value != end for t in self.trials)]
                if not untried:
                    return None, self._none()
                guess = self._newton(trial)
                value = (
                    guess
                    if guess is not None and guess not in self._tried()
                    else self._nearest(untried, guess)
                )
                continue
            met, missed = inner
            # The unfavourable end moves in jumps with the steps of each run: no use in going closer.
            closest = self._tolerance(met.value) * (5.0 if self.with_margin else 1.0)
            if abs(met.value - missed.value) <= closest:
                return met.value, self._said(met)
            value = self._inside(met, missed, trial)
        best = min(
            (t for t in self.trials if self._meets(t)),
            key=lambda t: self.within - (t.time or 0.0),
            default=None,
        )
        if best is None:
            return None, f"nothing was found in {len(self.trials)} runs"
        return best.value, self._said(best) + "; the search has not settled any further"

    def _first(self) -> float:
        """Start at the case's own value where it lies in the interval."""
        own = value_of(self.case, self.key)
        low, high = sorted(self.ends)
        if isinstance(own, Signal):
            own = float(own.values[0])
        return own if own is not None and low <= own <= high else self.bend.middle(low, high)

    def _run(self, value: float) -> Trial:
        if value not in self.ends and self.trials:
            value = self.kind.read(written(self.kind, value, DIGITS))
        text = written(self.kind, value)
        self.progress(f"run {len(self.trials) + 1}: {self.key} = {text}")
        case = loads(self.case.text, self.case.source, self.case.folder, [f'{self.key}="{text}"'])
        summary = run(self._followed(case), numerical_error=False).summary
        time, slope = summary["aim"]["time_s"], None
        known = summary["uncertainty"]
        if time is not None and known is not None and known["time_s"] is not None:
            entry = next((e for e in known["inputs"] if e["key"] == self.key), None)
            spread = self._spreads[self.key]
            if entry is not None:
                half = spread.size * abs(value) if spread.relative else spread.size
                slope = 0.5 * (entry["effect_of_more_s"] - entry["effect_of_less_s"]) / half
            if self.with_margin:
                slope = None if slope is None else slope * known["time_s"]["high"] / time
                time = known["time_s"]["high"]
        trial = Trial(value, time, slope)
        self.trials.append(trial)
        return trial

    def _followed(self, case: Case) -> Case:
        """Return the case with the varied key among its uncertain inputs."""
        spread = Spread(HAIR, relative=self.kind.unit != "degC")
        spreads: dict[str, Spread] = {}
        if self.with_margin:
            if case.uncertainty is None:
                plan = Plan.of(case)
                product = {region: case.regions[region] for region in plan.body.domain.product}
                spreads = usual_uncertainty(case, product)
            else:
                spreads = dict(case.uncertainty)
        moves = not self.key.startswith(("shape.", "piece.length"))
        if self.key not in spreads and (moves or self._on_one_mesh(case)):
            spreads[self.key] = spread
        self._spreads = spreads
        return replace(case, uncertainty=spreads)

    def _on_one_mesh(self, case: Case) -> bool:
        plan = Plan.of(case)
        entry = Input(self.key, Spread(HAIR, relative=True))
        return any(moved(plan, entry, by) is not None for by in (1e-4, -1e-4))

    def _meets(self, trial: Trial) -> bool:
        return trial.time is not None and trial.time <= self.within

    def _tolerance(self, value: float) -> float:
        return WITHIN_K if self.kind.unit == "degC" else WITHIN_SHARE * abs(value)

    def _close(self, trial: Trial) -> bool:
        """Whether a trial meets the aim, and no value further than the tolerance would just meet it."""
        if not self._meets(trial) or not trial.slope or trial.time is None:
            return False
        return self.within - trial.time <= self._band(trial)

    def _band(self, trial: Trial) -> float:
        """Return by how much the time of a trial may fall short of the time given [s]."""
        assert trial.slope is not None
        by_value = self._tolerance(trial.value) * abs(trial.slope)
        return max(by_value, MARGIN_SHARE * self.within) if self.with_margin else by_value

    def _tried(self) -> set[float]:
        return {t.value for t in self.trials}

    def _newton(self, trial: Trial) -> float | None:
        """Return where the tangent meets the middle of what counts as just met, inside the interval."""
        if trial.time is None or not trial.slope:
            return None
        goal = self.within - 0.5 * self._band(trial)
        step = (goal - trial.time) / trial.slope * self.bend.pace(trial.value)
        there = self.bend.back(self.bend.forth(trial.value) + step)
        low, high = sorted(self.ends)
        if there is None:
            return high if trial.slope * (goal - trial.time) > 0 else low
        return float(np.clip(there, low, high))

    def _bracket(self) -> tuple[Trial, Trial] | None:
        """Return the closest pair of a trial that meets the aim and one that does not."""
        met = [t for t in self.trials if self._meets(t)]
        missed = [t for t in self.trials if not self._meets(t)]
        pairs = [(a, b) for a in met for b in missed]
        return min(pairs, key=lambda pair: abs(pair[0].value - pair[1].value)) if pairs else None

    def _inside(self, met: Trial, missed: Trial, last: Trial) -> float:
        """Return the next value between two trials: Newton's where it stays inside, else the middle."""
        low, high = sorted((met.value, missed.value))
        before, self._width = self._width, high - low
        # Newton may creep up from one side for ever, where the time jumps: then the bracket is halved.
        if self._width <= 0.5 * before:
            away = 0.02 * (high - low)
            for trial in (last, met, missed):
                guess = self._newton(trial)
                if guess is not None and low + away < guess < high - away:
                    return guess
        return self.bend.middle(low, high)

    @staticmethod
    def _nearest(untried: Sequence[float], guess: float | None) -> float:
        return untried[0] if guess is None else min(untried, key=lambda end: abs(end - guess))

    def _said(self, trial: Trial) -> str:
        assert trial.time is not None
        which = "the unfavourable end of its time" if self.with_margin else "its time"
        runs = len(self.trials)
        return (
            f"{self._name()} {written(self.kind, trial.value, 4)} just meets the aim: {which} is "
            f"{duration(trial.time)} of {duration(self.within)} ({runs} run{'s' if runs > 1 else ''})"
        )

    def _name(self) -> str:
        return "h" if self.key.endswith(".h") else name_of(self.key)

    def _none(self) -> str:
        low, high = (written(self.kind, end) for end in sorted(self.ends))
        runs = f"({len(self.trials)} runs)"
        ends = [t for t in self.trials if t.value in self.ends]
        if all(self._meets(t) for t in ends):
            best = max(ends, key=lambda t: t.time or 0.0)
            assert best.time is not None
            return (
                f"there is none: from {low} to {high} the aim is met throughout, "
                f"in {duration(best.time)} at most {runs}"
            )
        reached = [t for t in ends if t.time is not None]
        if not reached:
            ends_said = f"at neither end, {low} or {high}"
            return f"there is none: {ends_said}, is the aim reached before the stages end {runs}"
        best = min(reached, key=lambda t: t.time or 0.0)
        assert best.time is not None
        return (
            f"there is none: from {low} to {high} the aim is missed throughout; best is "
            f"{written(self.kind, best.value)}, with {duration(best.time)} of {duration(self.within)} {runs}"
        )


@dataclass(frozen=True)
class Bend:
    """The variable in which the time is straight: x itself, or 1/(zero - x).

    Parameters
    ----------
    zero
        Where the time has its pole; None for x itself.

    """

    zero: float | None

    @classmethod
    def of(cls, case: Case, key: str, ends: tuple[float, float]) -> Bend:
        """Return the variable for a key: Plank's form for what drives the heat."""
        word = key.rsplit(".", 1)[1]
        if word in ("h", "conductivity_factor"):
            return cls(0.0)
        if word in ("coolant", "surroundings", "temperature"):
            built = [case.materials[name].build() for name in dict.fromkeys(case.regions.values())]
            points = [m.freezing_point for m in built if m.freezing_point is not None]
            if points and all(end < min(points) for end in ends):
                return cls(min(points))
        return cls(None)

    def forth(self, x: float) -> float:
        """Return the variable at a value."""
        return x if self.zero is None else 1.0 / (self.zero - x)

    def back(self, y: float) -> float | None:
        """Return the value; None where it lies beyond the pole."""
        if self.zero is None:
            return y
        sign = -1.0 if self.zero == 0.0 else 1.0
        return self.zero - 1.0 / y if y * sign > 1e-12 else None

    def pace(self, x: float) -> float:
        """Return how fast the variable moves with the value."""
        return 1.0 if self.zero is None else 1.0 / (self.zero - x) ** 2

    def middle(self, low: float, high: float) -> float:
        """Return the value halfway between two, in the variable."""
        there = self.back(0.5 * (self.forth(low) + self.forth(high)))
        return 0.5 * (low + high) if there is None else there


def written(kind: Kind, value: float, digits: int = 9) -> str:
    """Return a value as a case has it; SI is not what lengths and times are read in."""
    unit, size = {"m": ("mm", 1e-3), "s": ("min", 60.0)}.get(kind.unit, (kind.unit, 1.0))
    text = f"{value / size:.{digits}g} {unit}".replace("percent", "%")
    return text.removesuffix(" 1") if kind.unit == "1" else text
