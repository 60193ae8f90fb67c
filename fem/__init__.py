"""Freezing of moulded frozen water-ice confections: from a case file to a time, a place and a heat.

From Python, each of these does what the command of its name does:

>>> import fem
>>> case = fem.load("cases/workshop_bar.toml", ["stepping.accuracy=quick"])
>>> result = fem.run(case, ranges=False, numerical_error=False)
>>> round(result.summary["aim"]["time_s"], -2)
1200.0
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from fem.case.read import load as load
    from fem.result.compare import compare as compare
    from fem.result.folder import open_run as open_run
    from fem.run import run as run
    from fem.series.fit import fit as fit
    from fem.series.setpoint import setpoint as setpoint
    from fem.series.sweep import sweep as sweep

# Loaded when they are asked for: the command line has to answer --help at once.
_HOMES = {
    "compare": "fem.result.compare",
    "fit": "fem.series.fit",
    "load": "fem.case.read",
    "open_run": "fem.result.folder",
    "run": "fem.run",
    "setpoint": "fem.series.setpoint",
    "sweep": "fem.series.sweep",
}
__all__ = list(_HOMES)


def __getattr__(name: str) -> Any:
    """Return what is called from outside, loading its module."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)
