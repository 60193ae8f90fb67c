"""The report's pictures of how sure the time is: beside its estimates, and what it hangs on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from fem.result.answer import duration, input_names
from fem.result.confidence import known, own_time, ratio_of, time_range
from fem.result.drawing import BLACK, GREY, LINES, WIDTH, drawing, label_of, svg_text

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MOST_INPUTS = 8
LESS, MORE = LINES[5], LINES[1]
RANGE = "#b9d3e6"
ROW = 0.36  # inches


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
            for x, side in ((low, "right"), (high, "left")):
                shift = (-3 if side == "right" else 3, 0)
                note = dict(xytext=shift, textcoords="offset points", ha=side, va="center", size=7.5)
                ax.annotate(f"{x:.3g}", (x, 0), color=BLACK, **note)
        error = known((summary.get("numerical_error") or {}).get("time_s")) or 0.0
        ax.errorbar(own / scale, 0, xerr=error / scale, fmt="o", ms=5, color=BLACK, capsize=3, lw=1.2, zorder=5)
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
    named = dict(zip(map(id, _all_inputs(summary)), input_names(_all_inputs(summary)), strict=True))
    sizes = [abs(v) for e in inputs for v in _both(e)]
    most = max(sizes, default=0.0)
    scale, unit = (1.0, "s") if most < 600.0 else _unit(most)
    with drawing() as figure_of:
        figure = figure_of((WIDTH, height(summary)))
        ax = figure.add_subplot()
        _rows(ax, [f"{label_of(named[id(e)])} ± {e['half_width']}" for e in inputs], [e["words"] for e in inputs])
        for colour, word, which in ((LESS, "less", 0), (MORE, "more", 1)):
            lengths = [_both(e)[which] / scale for e in inputs]
            ax.barh(range(len(inputs)), lengths, height=0.5, color=colour, label=f"{word} of it", zorder=2)
        for row, entry in enumerate(inputs):
            _label_ends(ax, row, [v / scale for v in _both(entry)])
        reach = 1.32 * max(most / scale, 1e-9)
        ax.set_xlim(-reach, reach)
        ax.axvline(0.0, color=BLACK, lw=0.8, zorder=3)
        ax.set_xlabel(f"change of the time in {unit}")
        figure.legend(*ax.get_legend_handles_labels(), loc="outside upper right", ncols=2)
        return svg_text(figure)


def _all_inputs(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    return list((summary.get("uncertainty") or {}).get("inputs") or [])


def _inputs(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return the inputs, that with the widest effect first."""

    def width(entry: Mapping[str, Any]) -> float:
        less, more = _both(entry)
        return -abs(more - less)

    return sorted(_all_inputs(summary), key=width)


def _both(entry: Mapping[str, Any]) -> tuple[float, float]:
    return known(entry["effect_of_less_s"]) or 0.0, known(entry["effect_of_more_s"]) or 0.0


def _estimates(summary: Mapping[str, Any]) -> list[dict[str, Any]]:
    return [e for e in summary.get("estimates") or [] if e["time_s"] is not None and e["time_s"] > 0][:5]


def _estimate(ax: Axes, row: int, estimate: Mapping[str, Any], ratio: float | None, scale: float) -> None:
    """Draw an estimate: where the run's own time may lie by it, hollow where it does not hold."""
    at, colour = estimate["time_s"] / scale, LINES[0]
    if ratio is not None and estimate.get("in_range") and (band := estimate.get("band")) is not None:
        ax.plot([at * band[0], at * band[1]], [row, row], color=colour, lw=2.0, solid_capstyle="butt", zorder=3)
    marker = ">" if estimate["method"] == "Plank" else "D"
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
    if ends[0] == ends[1] == 0.0:
        ax.annotate("hardly", (0.0, row), xytext=(4, 0), textcoords="offset points", va="center", size=7.5)
        return
    for value in ends:
        left = value < 0.0
        ax.annotate(
            f"{value:+.3g}".replace("-", "−"),
            (value, row),
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
