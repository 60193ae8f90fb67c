"""What a person sees of a set-point, of a fit and of runs side by side: the sentence first."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from rich.console import Console
from rich.table import Table
from rich.text import Text

from fem.result.answer import duration, span

if TYPE_CHECKING:
    from pathlib import Path

    from fem.result.compare import Comparison
    from fem.series.fitted import Fit
    from fem.series.setpoint import SetPoint


def show_setpoint(found: SetPoint, case: Path, to_stderr: bool = False) -> None:
    """Print the value that just meets the aim, and every run of the search."""
    console = _console(to_stderr)
    console.print(found.why[0].upper() + found.why[1:] + ".", style="bold", soft_wrap=True)
    console.print()
    table = Table(found.key, "likely time" if not found.with_margin else "unfavourable time", box=None)
    for trial in found.trials:
        time = "not reached" if trial.time is None else f"{duration(trial.time)} ({trial.time:.0f} s)"
        table.add_row(found.written(trial.value, 6), time)
    console.print(table)
    if found.text is not None:
        console.print()
        console.print(Text(f'next: rimefront run {case} --set {found.key}="{found.text}"'), soft_wrap=True)


def show_fit(found: Fit, written: Path | None, to_stderr: bool = False) -> None:
    """Print what was fitted, how far that is to be trusted, and where the case stands."""
    console = _console(to_stderr)
    console.print(Text(found.sentence()), style="bold", soft_wrap=True)
    console.print()
    table = _grid()
    for number in found.numbers:
        table.add_row(number.name, f"{number.text(number.before)} before; {', '.join(number.keys)}")
        if (moved := number.if_moved()) is not None:
            low, high = (number.text(value) for value in moved)
            table.add_row("", f"a probe 2 mm off its place would make it {low} to {high}")
    for pour in found.pours:
        table.add_row("poured", pour.said())
    for trace in found.traces:
        place = f"{trace.log.name} at {trace.at}"
        table.add_row(
            "log", f"{place}: {len(trace.times)} times at temperatures, {found.rms_of(trace):.2g} s off"
        )
    table.add_row("effort", f"{found.marches} marches, those with moved probes counted")
    for remark in found.remarks:
        table.add_row("caution", Text(remark), style="yellow")
    if written is not None:
        table.add_row("fitted case", str(written))
        table.add_row("residuals", str(written.parent / "residuals.png"))
    console.print(table)


def show_comparison(found: Comparison, written: Path | None, to_stderr: bool = False) -> None:
    """Print runs side by side."""
    console = _console(to_stderr)
    console.print(Text(found.sentence()), style="bold", soft_wrap=True)
    console.print()
    heads = ("run", "time to aim", "likely", "in time", "heat", "ice", "equalised", "slowest")
    table = Table(*heads, box=None, header_style="bold", pad_edge=False)
    for o in found.outcomes:
        table.add_row(
            Text(o.name),
            _said(o.time, duration),
            "-" if o.likely is None else span(*o.likely),
            o.verdict,
            f"{o.heat_removed / 1e3:.2f} kJ",
            _said(o.ice, lambda ice: f"{100 * ice:.0f} %"),
            _said(o.mean, lambda T: f"{T:.1f} degC"),
            f"{o.slowest:.1f} degC",
        )
    console.print(table)
    console.print()
    if not found.keys:
        console.print("Their cases say the same.")
    else:
        differing = Table("differs", *(o.name for o in found.outcomes), box=None, pad_edge=False)
        for n, key in enumerate(found.keys):
            differing.add_row(key, *(Text(o.settings[n]) for o in found.outcomes))
        console.print(differing)
    for remark in found.remarks:
        console.print(Text(f"({remark})"), style="yellow", soft_wrap=True)
    if written is not None:
        console.print()
        console.print(Text(f"page: {written}"), soft_wrap=True)


def _said(value: float | None, text: Any) -> str:
    return "-" if value is None else str(text(value))


def _console(to_stderr: bool) -> Console:
    # Wide enough for whole tables where nobody watches.
    console = Console(stderr=to_stderr, highlight=False, markup=False)
    return (
        console
        if console.is_terminal
        else Console(stderr=to_stderr, highlight=False, markup=False, width=160)
    )


def _grid() -> Table:
    table = Table.grid(padding=(0, 2))
    table.add_column(style="cyan", no_wrap=True)
    table.add_column(overflow="fold")
    return table
