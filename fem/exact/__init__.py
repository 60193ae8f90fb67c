"""Exact and semi-analytic solutions of freezing, which the solver is judged by.

Heat that leaves a body counts as positive; SI units and degC; times and places broadcast together.
"""

from fem.exact import quasi_steady
from fem.exact.growth import corner_diagonal, corner_front, frank_root, recalescence
from fem.exact.inward import InwardFreezing, stefan_root
from fem.exact.line_sink import LineSink
from fem.exact.material import RangeFreezing, Rows, SharpFreezing
from fem.exact.plane import Neumann, ThreeZone
from fem.exact.similarity import Similarity
from fem.exact.wave import TravellingWave

__all__ = [
    "InwardFreezing",
    "LineSink",
    "Neumann",
    "RangeFreezing",
    "Rows",
    "SharpFreezing",
    "Similarity",
    "ThreeZone",
    "TravellingWave",
    "corner_diagonal",
    "corner_front",
    "frank_root",
    "quasi_steady",
    "recalescence",
    "stefan_root",
]
