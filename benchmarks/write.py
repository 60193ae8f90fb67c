"""What does a frame of the fields cost, beside a factorisation of the same mesh?

Frames of each format are written for a bar of several sizes; the cost is a difference between
many frames and few, so that opening files and importing libraries does not count.
"""

from __future__ import annotations

import tempfile
import time
from functools import partial
from pathlib import Path

from table import Tables, options

CASE = Path(__file__).parent.parent / "cases" / "workshop_bar.toml"


def main() -> None:
    asked = options(__doc__).parse_args()
    tables = Tables(asked.json)
    rows = [row for cell in (0.8, 0.3, 0.14) for row in _costs(cell)]
    columns = ["nodes", "format", "ms a frame", "bytes a node", "frames for one factorisation's time"]
    tables.add("Frames of the fields", columns, rows)
    tables.close()


def _costs(cell: float) -> list[list[float | str]]:
    import numpy as np

    from fem.case.read import load
    from fem.heat import forms
    from fem.plan import Plan
    from fem.result.fields import FORMATS, Fields
    from fem.watch.product import Product

    rows: list[list[float | str]] = []
    plan = Plan.of(load(CASE, (f"shape.cell={cell} mm",)))
    body = plan.body
    data = sum(body.pattern.gather(*forms.conductance(body.domain, region)) for region in body.domain.regions)
    data[body.pattern.diagonal] *= 2.0
    factor = min(_seconds(lambda: body.factor.solve(data, np.ones(body.size))) for _ in range(5))
    for kind in FORMATS:
        watch = plan.case.watch.model_copy(update={"fields": kind})
        with tempfile.TemporaryDirectory() as folder:
            fields = Fields(Path(folder), watch, Product(body), -12.0, plan.start)
            sizes, times = [_size(folder)], []
            for frame in range(1, 21):
                # A field that changes: a constant one would be compressed to nothing.
                u = plan.start * (1.0 + 0.01 * frame * np.hypot(*body.domain.points) / 0.03)
                times.append(_seconds(partial(fields.end_stage, 60.0 * frame, u)))
                sizes.append(_size(folder))
        # The middle one of the frames: the first opens, and the machine disturbs a few.
        cost = float(np.median(times[2:]))
        size = (sizes[-1] - sizes[1]) / 19
        rows.append([body.size, kind, 1e3 * cost, size / body.size, factor / cost])
    return rows


def _seconds(function) -> float:  # type: ignore[no-untyped-def]
    began = time.perf_counter()
    function()
    return time.perf_counter() - began


def _size(folder: str) -> int:
    return sum(path.stat().st_size for path in Path(folder).rglob("*") if path.is_file())


if __name__ == "__main__":
    main()
