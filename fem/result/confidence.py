"""How sure an answer is, from a summary alone: its numerical error, its range, an estimate beside it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from fem.result.answer import duration, span

# The most reliable first.
METHODS = {
    "Poisson": "from one Poisson solve",
    "Pham": "by hand, Pham's method",
    "Plank": "by hand, Plank's bound",
}
# It agrees with nothing.
BOUND = "Plank"


class Answer(NamedTuple):
    """One of the three answers: what it is, the number, what belongs beside it, and what it rests on."""

    label: str
    value: str
    beside: str
    notes: list[str]


def answers(summary: Mapping[str, Any]) -> list[Answer]:
    """Return the three answers to when the aim is met; none where no time answers, or nothing is known."""
    known = [summary.get(key) for key in ("numerical_error", "uncertainty", "estimates")]
    if own_time(summary) is None or not any(known):
        return []
    return [_of_the_run(summary), _range(summary), _estimate(summary)]


def own_time(summary: Mapping[str, Any]) -> float | None:
    """Return when the aim was reached [s]; None where it was not, or there is none."""
    aim = summary["aim"]
    return aim["time_s"] if aim is not None else None


def time_range(summary: Mapping[str, Any]) -> tuple[float, float] | None:
    """Return the interval that the time lies in 19 times out of 20 [s]; None where not known."""
    spread = (summary.get("uncertainty") or {}).get("time_s")
    if spread is None or own_time(summary) is None:
        return None
    return max(spread["low"], 0.0), max(spread["high"], 0.0)


def doubt(summary: Mapping[str, Any]) -> str:
    """Say how the time given lies to the range; empty where there is no range or no time given."""
    found = time_range(summary)
    within = summary["aim"]["within_s"] if found is not None else None
    if found is None or within is None:
        return ""
    given = f"the {duration(within)} given"
    if found[1] <= within:
        return f"even its late end keeps {given}"
    if found[0] > within:
        return f"even its early end is past {given}"
    late = duration(found[1] - within)
    return f"{given} lie inside it: kept at its early end, missed by {late} at its late end"


def ratio_of(summary: Mapping[str, Any], estimate: Mapping[str, Any]) -> float | None:
    """Return the run's time over an estimate; None where either is not known, or they are of two places."""
    if estimate.get("ratio") is not None:
        return float(estimate["ratio"])
    own, time = own_time(summary), estimate["time_s"]
    if not own or not time or summary["aim"]["at"] != "slowest":
        return None
    return own / time


def by_rank(estimates: Sequence[dict[str, Any]]) -> list[dict[str, Any]]:
    """Return the estimates, the most reliable method first."""
    rank = {method: place for place, method in enumerate(METHODS)}
    return sorted(estimates, key=lambda estimate: rank.get(estimate["method"], len(rank)))


def error_text(seconds: float) -> str:
    """Return an error of a time, to two figures.

    >>> error_text(2.0518), error_text(0.0312), error_text(300.0)
    ('2.1 s', '0.031 s', '5 min')
    """
    return f"{seconds:.2g} s" if 0.0 <= seconds < 99.5 else duration(seconds)


def known(value: Any) -> float | None:
    """Return a number that may be missing, or NaN where a derivative could not be taken."""
    return None if value is None or math.isnan(value) else float(value)


def _of_the_run(summary: Mapping[str, Any]) -> Answer:
    time = own_time(summary)
    assert time is not None
    error = summary.get("numerical_error")
    if error is None:
        notes = ["no numerical error was estimated with this run"]
        return Answer("This run", duration(time), "", notes)
    size = known(error["time_s"])
    if size is None:
        return Answer("This run", duration(time), "", [f"numerical error: {error['how']}"])
    return Answer("This run", duration(time), f"± {error_text(size)}", [f"numerical error: {error['how']}"])


def _range(summary: Mapping[str, Any]) -> Answer:
    found, label = time_range(summary), "Likely range"
    uncertainty = summary.get("uncertainty")
    if found is None or uncertainty is None:
        return Answer(label, "–", "", ["this run carried none along"])
    notes = [doubt(summary)] if doubt(summary) else []
    if uncertainty["inputs"]:
        notes.append(f"most of all: {uncertainty['inputs'][0]['words']}")
    return Answer(label, span(*found).replace("-", " to "), "19 times in 20", notes)


def _estimate(summary: Mapping[str, Any]) -> Answer:
    label = "Estimate without the run"
    rated = [(e, ratio_of(summary, e)) for e in by_rank(summary.get("estimates") or [])]
    usable = [(e, ratio) for e, ratio in rated if ratio is not None and e["method"] != BOUND]
    if not usable:
        return Answer(label, "–", "", ["there is none for this case"])
    estimate, ratio = min(usable, key=lambda pair: not pair[0].get("in_range"))
    text = f"the run takes {ratio:.2f} of it"
    if not estimate.get("in_range"):
        text += "; out of its range here, so neither speaks against the other"
    elif (band := estimate.get("band")) is not None:
        agree = band[0] <= ratio <= band[1]
        text += f", {band[0]:g} to {band[1]:g} is allowed: " + ("they agree" if agree else "they disagree")
    return Answer(
        label, duration(estimate["time_s"]), METHODS.get(estimate["method"], estimate["method"]), [text]
    )
