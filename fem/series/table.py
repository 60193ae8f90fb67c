"""The table of a sweep: one tidy row a run, units in its headers."""

from __future__ import annotations

import csv
import importlib.util
import io
import math
from pathlib import Path
from typing import Any

from fem.result.disk import replace
from fem.series.axes import Point
from fem.series.sweep_plan import SweepPlan
from fem.series.variations import RESULTS, number_and_unit

TABLE, PARQUET = "table.csv", "table.parquet"
Row = dict[str, Any]


class Heads:
    """The columns of a plan's table.

    Parameters
    ----------
    plan
        As read.

    """

    def __init__(self, plan: SweepPlan):
        self.plan = plan
        self.varied = {name: _headed(name, plan.unit_of(name)) for axis in plan.axes for name in axis.names}
        self.results = {name: f"{name} [{unit}]" for name, (unit, _) in RESULTS.items()}

    def row(self, point: Point, summary: dict[str, Any] | None, why: str, folder: str) -> Row:
        """Return the row of a run.

        Parameters
        ----------
        point
            The run.
        summary
            As in ``summary.json``; None where it came to nothing.
        why
            Reason of a failure.
        folder
            Where it stands, from the folder of the sweep; empty where there is none.

        """
        row: Row = {"run": point.number}
        for name, head in self.varied.items():
            read = number_and_unit(point.labels[name]) if self.plan.unit_of(name) is not None else None
            row[head] = read[0] if read else _text(point.labels[name])
        finished = summary is not None and summary["outcome"] == "finished"
        values = _values(summary) if summary is not None and finished else dict.fromkeys(RESULTS)
        aim = (summary or {}).get("aim") if finished else None
        row |= {self.results["time_to_aim"]: values["time_to_aim"], "met": aim["met"] if aim else None}
        row["passes"] = self._passes(row, values, aim) if finished else None
        row |= {self.results[name]: values[name] for name in list(RESULTS)[1:]}
        if self.plan.keep.ranges:
            spread = ((summary or {}).get("uncertainty") or {}).get("time_s") or {}
            for end in ("low", "high"):
                row[f"time_to_aim.{end} [s]"] = spread.get(end) if finished else None
        row["outcome"] = summary["outcome"] if summary is not None else "failed"
        return row | {"reason": why, "folder": folder}

    def _passes(self, row: Row, values: dict[str, Any], aim: dict[str, Any] | None) -> bool:
        """Say whether a run meets its aim and stays within every limit."""
        seen = {**values, **{name: row[head] for name, head in self.varied.items()}}
        for name, (least, most) in self.plan.limits.items():
            if seen[name] is None or not least <= seen[name] <= most:
                return False
        return aim is None or bool(aim["met"])


def _headed(name: str, unit: str | None) -> str:
    return f"{name} [{unit or '-'}]" if unit is not None else name


def _text(label: Any) -> str:
    return label if isinstance(label, str) else str(label)


def _values(summary: dict[str, Any]) -> dict[str, float | None]:
    last = summary["stages"][-1]
    aim = summary["aim"]
    return {
        "time_to_aim": aim["time_s"] if aim is not None else None,
        "slowest": summary["slowest"]["temperature_degC"],
        "mean": last["mean_degC"],
        "heat_removed": summary["heat_removed_J"],
        "ice_mean": last["ice"],
    }


def write_table(rows: list[Row], root: Path) -> list[Path]:
    """Write the table as CSV, and as Parquet where pyarrow is installed; return the files."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(rows[0])
    writer.writerows([_cell(value) for value in row.values()] for row in rows)
    replace(root / TABLE, text.getvalue())
    written = [root / TABLE]
    if importlib.util.find_spec("pyarrow") is not None:
        import pyarrow
        from pyarrow import parquet

        columns = pyarrow.Table.from_pydict({head: [row[head] for row in rows] for head in rows[0]})
        part = root / (PARQUET + ".part")
        parquet.write_table(columns, part)
        part.replace(root / PARQUET)
        written.append(root / PARQUET)
    return written


def _cell(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "true" if value else "false"
    return f"{value:.9g}" if isinstance(value, float) else str(value)


def known(rows: list[Row], head: str) -> list[float]:
    """Return the numbers of a column that are there."""
    return [row[head] for row in rows if row[head] is not None and math.isfinite(row[head])]
