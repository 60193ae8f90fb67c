"""All that several logs say, side by side: times at temperatures, whose clock each is on."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.curve import Array
from fem.errors import CaseError, Problem, unknown
from fem.plan import Plan
from fem.quantity import Kind
from fem.series.probe import ProbeLog
from fem.series.stretch import Stretches, stretches

SINCE = Kind("time", "s", "35 s")


@dataclass(frozen=True, eq=False)
class Evidence:
    """Times at temperatures of all logs, one after another.

    Parameters
    ----------
    logs
        In their order.
    at
        Watched point of each time, length k.
    times
        On the log's clock, less the pour where that is known [s], shape (k,).
    temperatures, noise
        [degC] and its standard deviation [K], shape (k,).
    owner
        Which log each time is from, shape (k,).
    pour_columns
        What each fitted pour adds to a time, shape (k, pours).
    pour_names
        Name and first clock [s] of the logs whose pour is fitted.
    known
        The pour of each log where it is known, else 0 [s].
    remarks
        What was left out and assumed, in sentences.

    """

    logs: tuple[ProbeLog, ...]
    at: tuple[str, ...]
    times: Array
    temperatures: Array
    noise: Array
    owner: NDArray[np.int64]
    pour_columns: Array
    pour_names: tuple[tuple[str, float], ...]
    known: tuple[float, ...]
    remarks: tuple[str, ...]

    @property
    def pours(self) -> int:
        """How many pours are fitted."""
        return self.pour_columns.shape[1]

    def traces(self) -> Iterator[tuple[ProbeLog, str, NDArray[np.int64]]]:
        """Yield each log, its point and which times are its own."""
        for i, log in enumerate(self.logs):
            rows = np.flatnonzero(self.owner == i)
            yield log, self.at[rows[0]], rows

    def check_duration(self, times: Array, most: float) -> None:
        """Refuse logs whose clock cannot be in the unit that it was read in.

        Parameters
        ----------
        times
            When the case, as it stands, passes the same temperatures [s].
        most
            Ratio of the two durations that is refused.

        Raises
        ------
        CaseError
            With both durations.

        """
        for log, _, rows in self.traces():
            ours, theirs = np.ptp(times[rows]), np.ptp(self.times[rows])
            if not 1.0 / most < theirs / ours < most:
                why = (
                    f"takes {theirs:.3g} s over temperatures for which the case needs {ours:.3g} s: look at "
                    "the unit of its clock, and head it [s] or [min]"
                )
                raise CaseError(str(log.file), [Problem("--log", why)])


def evidence(
    plan: Plan,
    logs: Sequence[ProbeLog],
    points: Sequence[str],
    pour: str | None,
    down_to: float | None,
) -> Evidence:
    """Gather what logs say.

    Parameters
    ----------
    plan
        The case made ready.
    logs
        As read.
    points
        The watched point of each log; one for all, or none.
    pour
        When the mix was poured, as the user says it; None where it is to be fitted.
    down_to
        Coldest level that counts [degC]; None for the usual one.

    Raises
    ------
    CaseError
        Every log that cannot be used.

    """
    places = _places(plan, len(logs), points)
    material = plan.body.materials[plan.body.domain.product[0]]
    assert material.freezing_point is not None, "asked for when the logs were read"
    used: list[Stretches] = []
    for log in logs:
        try:
            used.append(
                stretches(log, material.freezing_point, plan.start_temperature, plan.span[0], down_to)
            )
        except ValueError as error:
            raise CaseError(str(log.file), [Problem("--log", str(error))]) from error
    remarks = [remark for one in used for remark in one.remarks]
    for log, one in zip(logs, used, strict=True):
        if one.plateau is not None and abs(one.plateau - material.freezing_point) > 0.5:
            remarks.append(
                f"the plateau of {log.name} lies at {one.plateau:.1f} degC, the case's mix freezes from "
                f"{material.freezing_point:.1f} degC: fit the freezing_point too, or look at recipe and probe"
            )
    # The first cooling only dates the pour: what convection does to it must not pull at h.
    seen = [one.freezing if pour is not None else one.cooling + one.freezing for one in used]
    known = tuple(0.0 if pour is None else _pour(log, pour) for log in logs)
    sizes = [len(one.times) for one in seen]
    owner = np.repeat(np.arange(len(logs)), sizes)
    files = list(dict.fromkeys(log.file for log in logs))
    clock = np.array([files.index(logs[int(i)].file) for i in owner])
    columns = np.zeros((len(owner), 0))
    names: list[tuple[str, float]] = []
    if pour is None:
        columns = (clock[:, None] == np.arange(len(files))).astype(float)
        names = [next((log.name, log.clock) for log in logs if log.file == file) for file in files]
    return Evidence(
        tuple(logs),
        tuple(places[i] for i in owner),
        np.concatenate([one.times - known[i] for i, one in enumerate(seen)]),
        np.concatenate([one.temperatures for one in seen]),
        np.concatenate([one.noise for one in seen]),
        owner,
        columns,
        tuple(names),
        known,
        tuple(dict.fromkeys(remarks)),
    )


def _places(plan: Plan, logs: int, points: Sequence[str]) -> list[str]:
    known = list(plan.case.watch.points)
    chosen = list(points) or known[:1]
    for name in chosen:
        if name not in known:
            raise CaseError(plan.case.source, [Problem("--point", unknown("watched point", name, known))])
    if len(chosen) == 1:
        if logs > 1 and not points:
            message = f"is needed once for each of {logs} logs: where was each probe? ({', '.join(known)})"
            raise CaseError(plan.case.source, [Problem("--point", message)])
        return chosen * logs
    if len(chosen) != logs:
        message = f"is given {len(chosen)} times for {logs} logs; give one for each, or one for all"
        raise CaseError(plan.case.source, [Problem("--point", message)])
    return chosen


def _pour(log: ProbeLog, text: str) -> float:
    """Return when the mix was poured, since the log's first row [s]."""
    clock = re.fullmatch(r"(\d{1,2}):(\d{2})(?::(\d{2}(?:\.\d+)?))?", text.strip())
    try:
        if clock is None:
            return SINCE.read(text)
    except ValueError as error:
        forms = 'a clock as the log writes it ("14:03:20") or a time since its first row ("35 s")'
        message = f'is {forms}, got "{text}"'
        raise CaseError(str(log.file), [Problem("--pour", message)]) from error
    seconds = 3600.0 * int(clock[1]) + 60.0 * int(clock[2]) + float(clock[3] or 0.0)
    since = seconds - log.clock % 86400.0
    # The nearer of both days, where a night's log and its pour lie on either side of midnight.
    return since - 86400.0 * round(since / 86400.0)
