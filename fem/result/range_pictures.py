"""The report's pictures of how sure the time is: beside its estimates, and what it hangs on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from fem.result.answer import duration, input_names
from fem.result.confidence import BOUND, by_rank, known, own_time, ratio_of, time_range
from fem.result.drawing import BLACK, GREY, LINES, WIDTH, drawing, label_of, svg_text

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_INPUTS = 8
MOST_ESTIMATES = 5
LESS, MORE = LINES[5], LINES[1]
RANGE = "#b9d3e6"
ROW = 0.33  # inches


def height(summary: Mapping[str, Any]) -> float:
    """Return a height that both pictures can have, so that they stand level beside each other [in]."""
    rows = max(1 + len(_estimates(summary)), min(len(_inputs(summary)), MOST_INPUTS))
    return 0.75 + ROW * max(rows, 3)


def times(summary: Mapping[str, Any]) -> str:
    """Draw the time with its range and numerical error, its estimates and the time given.

    Parameters
    ----------
    summary
        As in ``summary.json``; its aim was reached.

    Returns
    -------
    SVG text.

    """
    own, spread = own_time(summary), time_range(summary)
    assert own is not None
    estimates = _estimates(summary)
    given = summary["aim"]["within_s"]
    seen = [own, *(spread or ()), *(e["time_s"] for e in estimates), *([given] if given else [])]
    scale, unit = _unit(max(seen))
    names = ["this run", *(label_of(e["method"]) for e in estimates)]
    values = [duration(own), *(duration(e["time_s"]) for e in estimates)]
    with drawing() as figure_of:
        figure = figure_of((WIDTH, height(summary)))
        ax = figure.add_subplot()
        _rows(ax, [f"{name}  {value}" for name, value in zip(names, values, strict=True)])
        ax.axvline(own / scale, color=GREY, lw=0.7, zorder=1)
        if spread is not None:
            low, high = (x / scale for x in spread)
            ax.barh(0, high - low, left=low, height=0.42, color=RANGE, zorder=2)
            _beside(ax, (low, 0), f"{low:.3g}", left=True)
            _beside(ax, (high, 0), f"{high:.3g}")
        error = known((summary.get("numerical_error") or {}).get("time_s")) or 0.0
        ax.errorbar(
            own / scale, 0, xerr=error / scale, fmt="o", ms=5, color=BLACK, capsize=3, lw=1.2, zorder=5
        )
        for row, estimate in enumerate(estimates, start=1):
            _estimate(ax, row, estimate, ratio_of(summary, estimate), scale)
        if given:
            _pass_line(ax, given / scale, f"{duration(given)} given")
        low, high = min(seen) / scale, max(seen) / scale
        room = max(high - low, 0.2 * high)
        ax.set_xlim(max(0.0, low - 0.16 * room), high + 0.16 * room)
        ax.set_xlabel(f"time to the aim in {unit}")
        return svg_text(figure)


def effects(summary: Mapping[str, Any]) -> str:
    """Draw what each uncertain input does to the time, the most important first; returns SVG text."""
    inputs = _inputs(summary)[:MOST_INPUTS]
    names = input_names(_inputs(summary))
    sizes = [abs(v) for e in inputs for v in _both(e)]
    most = max(sizes, default=0.0)
    scale, unit = (1.0, "s") if most < 600.0 else _unit(most)
    labels = [f"{label_of(n)} ± {label_of(e['half_width'], 16)}" for n, e in zip(names, inputs, strict=False)]
    with drawing() as figure_of:
        figure = figure_of((WIDTH, height(summary)))
        ax = figure.add_subplot()
        _rows(ax, labels, [label_of(e["words"], 56) for e in inputs])
        for colour, word, which in ((LESS, "lower", 0), (MORE, "higher", 1)):
            lengths = [_both(e)[which] / scale for e in inputs]
            ax.barh(range(len(inputs)), lengths, height=0.5, color=colour, label=word, zorder=2)
        for row, entry in enumerate(inputs):
            _label_ends(ax, row, [v / scale for v in _both(entry)])
            if known(entry["effect_of_less_s"]) is None and known(entry["effect_of_more_s"]) is None:
                _beside(ax, (0.0, row), "not known")
            elif _both(entry) == (0.0, 0.0):
                _beside(ax, (0.0, row), "none")
        reach = 1.32 * max(most / scale, 1e-9)
        ax.set_xlim(-reach, reach)
        ax.axvline(0.0, color=BLACK, lw=0.8, zorder=3)
        ax.set_xlabel(f"change of the time in {unit}")
        figure.legend(*ax.get_legend_handles_labels(), loc="outside upper right", ncols=2)
        return svg_text(figure)


def _inputs(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    return list((summary.get("uncertainty") or {}).get("inputs") or [])


def _both(entry: Mapping[str, Any]) -> tuple[float, float]:
    return known(entry["effect_of_less_s"]) or 0.0, known(entry["effect_of_more_s"]) or 0.0


def _estimates(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    found = by_rank(summary.get("estimates") or [])
    return [e for e in found if e["time_s"] is not None and e["time_s"] > 0.0][:MOST_ESTIMATES]


def _estimate(ax: Axes, row: int, estimate: Mapping[str, Any], ratio: float | None, scale: float) -> None:
    """Draw an estimate: where the run's own time may lie by it, hollow where it does not hold."""
    at, colour = estimate["time_s"] / scale, LINES[0]
    if ratio is not None and estimate.get("in_range") and (band := estimate.get("band")) is not None:
        ax.plot(
            [at * band[0], at * band[1]], [row, row], color=colour, lw=2.0, solid_capstyle="butt", zorder=3
        )
    marker = ">" if estimate["method"] == BOUND else "D"
    inside = colour if estimate.get("in_range") else "white"
    ax.plot(at, row, marker, ms=5.5, mfc=inside, mec=colour, mew=1.2, zorder=4)


def _pass_line(ax: Axes, at: float, said: str) -> None:
    ax.axvline(at, color=MORE, lw=1.3, ls=(0, (5, 2)), zorder=3)
    ax.annotate(
        said,
        (at, 1.0),
        xycoords=ax.get_xaxis_transform(),
        xytext=(0, 2),
        textcoords="offset points",
        ha="center",
        va="bottom",
        color=MORE,
        size=7.5,
    )


def _label_ends(ax: Axes, row: int, ends: Sequence[float]) -> None:
    """Write the values at the ends of two bars that leave 0."""
    for value in ends:
        if value != 0.0:
            text = f"{value:+.0f}" if abs(value) >= 10.0 else f"{value:+.2g}"
            _beside(ax, (value, row), text.replace("-", "−"), left=value < 0.0)


def _beside(ax: Axes, place: tuple[float, float], said: str, left: bool = False) -> None:
    """Write a text to the right or to the left of a place."""
    ax.annotate(
        said,
        place,
        xytext=(-3 if left else 3, 0),
        textcoords="offset points",
        ha="right" if left else "left",
        va="center",
        color=BLACK,
        size=7.5,
    )


def _rows(ax: Axes, labels: Sequence[str], words: Sequence[str] = ()) -> None:
    """Lay out a row for each label, the first on top, with plain words under it."""
    ax.set_yticks(range(len(labels)), [f"{label}\n" if words else label for label in labels])
    ax.set_ylim(len(labels) - 0.5, -0.5)
    ax.tick_params(axis="y", length=0)
    ax.grid(False, axis="y")
    ax.spines["left"].set_visible(False)
    for row, text in enumerate(words):
        ax.annotate(
            text,
            (0.0, row),
            xycoords=ax.get_yaxis_transform(),
            xytext=(-3.5, -1),
            textcoords="offset points",
            ha="right",
            va="top",
            color=GREY,
            size=7,
            annotation_clip=False,
        )


def _unit(seconds: float) -> tuple[float, str]:
    """Return the length [s] and the name of the unit that suits a time."""
    return (1.0, "s") if seconds < 120.0 else (60.0, "min") if seconds < 7200.0 else (3600.0, "h")
