"""How every picture of the report is drawn: its type, its colours, and out as SVG text."""

from __future__ import annotations

import io
import warnings
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any, cast

import numpy as np

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# Okabe and Ito's colours, told apart by readers with any kind of colour vision; black is for the slowest.
LINES = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
BLACK, GREY, PALE = "#1a1a1a", "#767676", "#f0f4f8"
# As wide as a phone shows it, so that 8 points stay readable there and on half a sheet of A4.
WIDTH, HEIGHT = 4.6, 2.75
DOTS = 220  # per inch, of what is drawn as a picture inside the SVG

_STYLE: dict[str, Any] = {
    "svg.fonttype": "none",
    "svg.hashsalt": "rimefront",
    "font.size": 8.0,
    "font.family": "sans-serif",
    "text.parse_math": False,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.edgecolor": GREY,
    "axes.labelcolor": BLACK,
    "axes.linewidth": 0.6,
    "axes.grid": True,
    "grid.color": "#e3e3e3",
    "grid.linewidth": 0.5,
    "xtick.color": GREY,
    "ytick.color": GREY,
    "xtick.labelcolor": BLACK,
    "ytick.labelcolor": BLACK,
    "xtick.labelsize": 7.5,
    "ytick.labelsize": 7.5,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "lines.linewidth": 1.4,
    "lines.solid_capstyle": "round",
    "legend.frameon": False,
    "legend.fontsize": 7.5,
    "legend.handlelength": 1.6,
    "legend.borderaxespad": 0.2,
    "legend.labelspacing": 0.3,
}


@contextmanager
def drawing() -> Iterator[Callable[[tuple[float, float]], Figure]]:
    """Give what makes a figure under the report's style."""
    import matplotlib
    from matplotlib.backends.backend_svg import FigureCanvasSVG
    from matplotlib.figure import Figure

    def figure_of(size: tuple[float, float]) -> Figure:
        figure = Figure(figsize=size, dpi=DOTS, layout="constrained")
        FigureCanvasSVG(figure)
        return figure

    # A name may hold letters that the measuring font lacks (the reader's own font shows them), and
    # matplotlib computes with gaps on purpose.
    with warnings.catch_warnings(), np.errstate(all="ignore"), matplotlib.rc_context(cast(Any, _STYLE)):
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        yield figure_of


@contextmanager
def stacked(rows: int) -> Iterator[tuple[Figure, list[Axes]]]:
    """Give a figure with so many axes above each other that share their times."""
    with drawing() as figure_of:
        figure = figure_of((WIDTH, HEIGHT))
        axes = figure.subplots(rows, 1, sharex=True, squeeze=False)[:, 0]
        yield figure, list(axes)


def svg_text(figure: Figure) -> str:
    """Return a figure as SVG text, the same each time it is drawn."""
    out = io.StringIO()
    figure.savefig(
        out, format="svg", dpi=DOTS, metadata={"Date": None, "Creator": None, "Format": None, "Type": None}
    )
    return out.getvalue()


def label_of(name: str, longest: int = 32) -> str:
    """Return a user's name as a label, shortened where it is longer than so many letters."""
    # matplotlib leaves labels out of the legend that begin with an underscore.
    short = name if len(name) <= longest else name[: longest - 1] + "…"
    return "\u200a" + short if short.startswith("_") else short
