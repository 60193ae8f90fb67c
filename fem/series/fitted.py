"""A fit's outcome: its numbers, its page of residuals, and the case with the numbers in it."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from fem.case.case import Case
from fem.case.origin import Origin, with_origins
from fem.case.portable import portable
from fem.curve import Array
from fem.errors import CaseError, Problem
from fem.quantity import Kind
from fem.series.probe import ProbeLog


@dataclass(frozen=True)
class Number:
    """A fitted number.

    Parameters
    ----------
    name, keys, kind
        In words, as dotted keys of the case, and as a quantity.
    value
        Fitted, in the unit of its kind.
    low, high
        The interval that holds it 19 times out of 20, as far as the log's noise and the march go.
    before
        What the case said.
    moved
        Where the probe was moved to -> what the fit would then have given; NaN for nothing.

    """

    name: str
    keys: tuple[str, ...]
    kind: Kind
    value: float
    low: float
    high: float
    before: float
    moved: dict[str, float]

    def text(self, value: float, digits: int = 4) -> str:
        """Return a value with its unit, as a case has it."""
        return self.kind.written(float(f"{value:.{digits}g}"))

    def interval(self) -> str:
        """Return ``"243 to 257 W/m2/K"``."""
        low, high = (float(f"{x:.4g}") for x in (self.low, self.high))
        return f"{low:g} to {self.kind.written(high)}" if high else f"{low:g} to 0"

    def if_moved(self) -> tuple[float, float] | None:
        """Return the range of the value over the places that the probe may have had."""
        known = [x for x in self.moved.values() if np.isfinite(x)]
        return (min(*known, self.value), max(*known, self.value)) if known else None


@dataclass(frozen=True)
class Pour:
    """When the mix was poured, fitted.

    Parameters
    ----------
    log
        Name of the log.
    clock
        What its first row's clock says [s].
    since
        Time of the pour since that row [s].
    half_width
        Of the interval that holds it 19 times out of 20 [s].

    """

    log: str
    clock: float
    since: float
    half_width: float

    def said(self) -> str:
        """Return when, in words."""
        at = self.clock + self.since
        text = f"{self.since:.0f} s after the first row of {self.log}, +-{self.half_width:.2g} s"
        if self.clock >= 3600.0:
            hours, rest = divmod(at % 86400.0, 3600.0)
            text += f" ({hours:02.0f}:{rest // 60:02.0f}:{rest % 60:02.0f} by its clock)"
        return text


@dataclass(frozen=True, eq=False)
class Trace:
    """One log beside the fitted case.

    Parameters
    ----------
    log, at
        The log and the watched point of its probe.
    times
        When the fitted case passes `temperatures`, since the pour [s], shape (k,).
    residuals
        The case's times less the log's [s], shape (k,).
    temperatures
        [degC], shape (k,).
    sigma
        Standard deviation that the weights give each time [s], shape (k,).
    pour
        When the mix was poured, since the log's first row [s].

    """

    log: ProbeLog
    at: str
    times: Array
    residuals: Array
    temperatures: Array
    sigma: Array
    pour: float


@dataclass(frozen=True, eq=False)
class Fit:
    """What a fit has found.

    Parameters
    ----------
    case
        As it was before.
    numbers, pours
        Fitted.
    traces
        Each log beside the fitted case.
    marches
        How many were needed, those with moved probes counted.
    scatter
        Misfit over what the logs' noise explains [-].
    remarks
        What a reader has to know, in sentences.

    """

    case: Case
    numbers: Sequence[Number]
    pours: Sequence[Pour]
    traces: Sequence[Trace]
    marches: int
    scatter: float
    remarks: Sequence[str]

    @property
    def rms(self) -> float:
        """Root of the mean square of all residuals [s]."""
        return float(np.sqrt(np.mean(np.concatenate([t.residuals for t in self.traces]) ** 2)))

    @staticmethod
    def rms_of(trace: Trace) -> float:
        """Root of the mean square of one log's residuals [s]."""
        return float(np.sqrt(np.mean(trace.residuals**2)))

    def sentence(self) -> str:
        """Return the answer."""
        said = "; ".join(f"{n.name} {n.text(n.value)} ({n.interval()})" for n in self.numbers)
        return f"Fitted: {said}; 19 times out of 20, as far as the log's noise and the march go."

    def fitted_text(self) -> str:
        """Return the case with the fitted numbers, each with its origin as a comment."""
        logs = ", ".join(dict.fromkeys(t.log.file.name for t in self.traces))
        origins = []
        for n in self.numbers:
            comment = f"fitted to {logs}: {n.interval()} (95 %); was {n.text(n.before)}"
            if (moved := n.if_moved()) is not None:
                comment += f"; probe 2 mm off: {n.text(moved[0])} to {n.text(moved[1])}"
            origins += [Origin(key, n.text(n.value), comment) for key in n.keys]
        return with_origins(self.case.text, origins, self.case.source)

    def as_dict(self) -> dict[str, Any]:
        """Return the outcome for JSON: SI, temperatures in degC."""
        return {
            "numbers": [
                {
                    "name": n.name,
                    "keys": list(n.keys),
                    "unit": n.kind.unit,
                    "value": n.value,
                    "low": n.low,
                    "high": n.high if np.isfinite(n.high) else None,
                    "before": n.before,
                    "if_probe_moved": {k: v if np.isfinite(v) else None for k, v in n.moved.items()},
                }
                for n in self.numbers
            ],
            "pours": [
                {"log": p.log, "since_first_row_s": p.since, "half_width_s": p.half_width} for p in self.pours
            ],
            "logs": [{"file": str(t.log.file), "point": t.at, "rms_s": self.rms_of(t)} for t in self.traces],
            "rms_s": self.rms,
            "scatter": self.scatter,
            "marches": self.marches,
            "remarks": list(self.remarks),
        }

    def write(self, folder: str | Path) -> Path:
        """Write the fitted case, ``fit.json``, ``residuals.csv`` and ``residuals.png``.

        Parameters
        ----------
        folder
            A folder that does not exist yet.

        Returns
        -------
        The fitted case's file.

        Raises
        ------
        CaseError
            Where the folder exists.
        OSError
            Where it cannot be written.

        """
        from shutil import copyfile

        from fem.series.residuals import draw, table

        folder = Path(folder)
        if folder.exists():
            raise CaseError(str(folder), [Problem("--into", "exists; choose another folder")])
        folder.mkdir(parents=True)
        text, files = portable(self.fitted_text(), self.case.folder)
        for name, source in files.items():
            (folder / name).parent.mkdir(parents=True, exist_ok=True)
            copyfile(source, folder / name)
        path = folder / "case.toml"
        path.write_text(text, encoding="utf-8")
        (folder / "fit.json").write_text(
            json.dumps(self.as_dict(), indent=2, ensure_ascii=False) + "\n", encoding="utf-8"
        )
        (folder / "residuals.csv").write_text(table(self.traces), encoding="utf-8")
        draw(self.traces, folder / "residuals.png")
        return path
