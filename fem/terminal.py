"""What a person sees: progress while a run goes on, and its answer."""

from __future__ import annotations

import json
import time as clock
from collections.abc import Iterable
from types import TracebackType
from typing import TYPE_CHECKING, Any, Self

import click
from rich.console import Console
from rich.table import Table

from fem.result.answer import details, duration, ranking, sentence
from fem.result.folder import Result

if TYPE_CHECKING:
    from fem.march.step import Moment
    from fem.series.sweep import Progress as SweepStands
    from fem.series.sweep import Sweep
    from fem.watch.record import Record


MOST_FAILURES = 12


class Progress:
    """A line that tells simulated time, ice and the time left; silent where nobody watches.

    Parameters
    ----------
    lasts
        Longest duration of the run [s].

    """

    def __init__(self, lasts: float):
        from rich.progress import BarColumn, TextColumn, TimeRemainingColumn
        from rich.progress import Progress as Bar

        self._lasts = lasts
        console = Console(stderr=True)
        self._bar = Bar(
            TextColumn("{task.fields[clock]:>10} of " + duration(lasts)),
            BarColumn(bar_width=30),
            TextColumn("{task.fields[ice]}"),
            TimeRemainingColumn(),
            console=console,
            transient=True,
            disable=not console.is_terminal,
        )
        self._task = self._bar.add_task("", total=lasts, clock="0 s", ice="")

    def __enter__(self) -> Self:
        """Start the line."""
        self._bar.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Clear the line."""
        self._bar.stop()

    def __call__(self, time: float, record: Record, moment: Moment) -> None:
        """Move the line to a time [s]."""
        if self._bar.disable:
            return
        product = record.product
        ice = product.mean_ice(product.ice(record.body.temperature(moment.u)))
        said = "" if ice != ice else f"ice {100 * ice:3.0f} %"
        self._bar.update(self._task, completed=time, clock=duration(time), ice=said)


class SweepProgress:
    """A table of the latest runs of a sweep with the time left; silent where nobody watches."""

    LATEST = 8

    def __init__(self) -> None:
        from rich.live import Live

        console = Console(stderr=True)
        self._watched = console.is_terminal
        self._live = Live(console=console, transient=True, refresh_per_second=4)
        self._rows: list[dict[str, Any]] = []
        self._began: float | None = None

    def __enter__(self) -> Self:
        """Open the table."""
        if self._watched:
            self._live.start()
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Clear the table."""
        self._live.stop()

    def __call__(self, seen: SweepStands) -> None:
        """Take note of a run."""
        if not self._watched:
            return
        self._began = self._began or clock.monotonic()
        if seen.row is not None:
            self._rows = [*self._rows[1 - self.LATEST :], seen.row]
        self._live.update(self._drawn(seen))

    def _drawn(self, seen: SweepStands) -> Table:
        """Return the table: how far it is, and the latest runs."""
        assert self._began is not None
        left = ""
        if seen.computed:
            each = (clock.monotonic() - self._began) / seen.computed
            left = f", {duration(each * (seen.of - seen.done))} left"
        failed = f", {seen.failed} failed" if seen.failed else ""
        title = f"{seen.done} of {seen.of} runs{failed}{left}"
        # What varies, the time and the verdict; the rest would not fit on a line.
        every = list(self._rows[-1]) if self._rows else []
        heads = [*every[: every.index("passes") + 1], "outcome"] if every else []
        shown = [head.replace(" [", "\n[") for head in heads]
        table = Table(*shown, title=title, title_justify="left", box=None, pad_edge=False)
        for row in self._rows:
            table.add_row(*(_cell(row[head]) for head in heads))
        return table


def show_sweep(swept: Sweep, to_stderr: bool = False) -> None:
    """Print the answer of a sweep, which runs failed and why, and where everything stands."""
    console = Console(stderr=to_stderr, highlight=False, markup=False)
    console.print(swept.summary["answer"], style="bold", soft_wrap=True)
    console.print()
    found = swept.summary["runs"] - swept.summary["computed"] - len(swept.failed)
    table = Table.grid(padding=(0, 2))
    table.add_column(style="cyan", no_wrap=True)
    table.add_column(overflow="fold")
    table.add_row("runs", f"{swept.summary['runs']}, of which {max(found, 0)} stood there already")
    table.add_row("table", str(swept.folder / swept.summary["table"]))
    table.add_row("page", str(swept.folder / "report.html"))
    if (picture := swept.folder / "window.png").exists():
        table.add_row("picture", str(picture))
    for row in swept.failed[:MOST_FAILURES]:
        table.add_row(f"run {row['run']} failed", row["reason"], style="yellow")
    if len(swept.failed) > MOST_FAILURES:
        table.add_row("", f"and {len(swept.failed) - MOST_FAILURES} more, in the table", style="yellow")
    console.print(table)


def _cell(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    return "" if value is None else f"{value:.5g}" if isinstance(value, float) else str(value)


def show_json(summary: dict[str, Any]) -> None:
    """Print ``summary.json`` on standard output, and nothing else."""
    click.echo(json.dumps(summary, indent=2, ensure_ascii=False))


def show_answer(result: Result, to_stderr: bool = False) -> None:
    """Print the answer: the sentence first, then what stands behind it."""
    console = Console(stderr=to_stderr, highlight=False, markup=False)
    console.print(sentence(result.summary), style="bold", soft_wrap=True)
    console.print()
    table = Table.grid(padding=(0, 2))
    table.add_column(style="cyan", no_wrap=True)
    table.add_column(overflow="fold")
    for label, text in details(result.summary):
        table.add_row(label, text, style="yellow" if label == "caution" else None)
    if result.folder is not None:
        table.add_row("run folder", str(result.folder))
        if (page := result.folder / "report.html").exists():
            table.add_row("report", str(page))
    console.print(table)
    show_ranking(console, result.summary)


def show_outlook(said: dict[str, Any], to_stderr: bool = False) -> None:
    """Print what is known of a case before it is run: the sentence first."""
    from rich.text import Text

    from fem.estimate import wording

    console = Console(stderr=to_stderr, highlight=False, markup=False)
    console.print(wording.sentence(said), style="bold", soft_wrap=True, markup=False)
    console.print()
    table = Table.grid(padding=(0, 2))
    table.add_column(style="cyan", no_wrap=True)
    table.add_column(overflow="fold")
    for label, text in wording.details(said):
        table.add_row(Text(label), Text(text), style="yellow" if label == "caution" else None)
    console.print(table)


def show_ranking(console: Console, summary: dict[str, Any]) -> None:
    """Print what the time hangs on, the most important input first."""
    rows = ranking(summary)
    if not rows:
        return
    uncertainty = summary["uncertainty"]
    console.print()
    console.print(f"What the time hangs on, inputs as uncertain as {uncertainty['source']}:", style="cyan")
    table = Table.grid(padding=(0, 1))
    for name, half_width, bar, text in rows:
        table.add_row(name, half_width, bar, text)
    console.print(table)
    for remark in uncertainty["remarks"]:
        console.print(f"({remark})", style="yellow", soft_wrap=True)


_VERDICT_HEADS = ("quantity", "exact", "ours", "error", "bound", "rate", "verdict")
_VERDICT = "{:<21} {:>12} {:>12} {:>8} {:>8} {:>4} {:>7}"


def show_verdicts(verdicts: Iterable[Any], as_json: bool) -> bool:
    """Print the lines of ``verify`` as they come; return whether all passed."""
    lines: list[Any] = []
    console = Console(stderr=as_json, highlight=False, markup=False)
    with Console(stderr=True).status("running cases with exact answers") as status:
        for verdict in verdicts:
            if not lines or lines[-1].check != verdict.check:
                console.print(f"\n{verdict.check}: {verdict.source}", soft_wrap=True, style="cyan")
                console.print(_VERDICT.format(*_VERDICT_HEADS), style="bold")
            lines.append(verdict)
            cells = (*verdict.cells()[1:], "passes" if verdict.passed else "FAILS")
            console.print(_VERDICT.format(*cells), style=None if verdict.passed else "bold red")
            status.update(f"{len(lines)} lines done, last: {verdict.check}")
    passed = all(verdict.passed for verdict in lines)
    console.print()
    console.print(
        f"{sum(v.passed for v in lines)} of {len(lines)} lines pass; each is a case through the same solver."
    )
    if as_json:
        click.echo(json.dumps([verdict.as_dict() for verdict in lines], indent=2))
    return passed


def show_refinement(refinement: Any, to_stderr: bool = False) -> None:
    """Print each number of a refined case: as run, extrapolated, and how far off either may be."""
    console = Console(stderr=to_stderr, highlight=False)
    heads = ("number", "as run", "off by at most", "refined", "off by at most", "order")
    table = Table(*heads, box=None, header_style="bold", pad_edge=False)
    for n in refinement.numbers:
        as_run, refined = (f"{value:.6g} {n.unit}" for value in (n.as_run, n.value))
        order = "-" if n.order is None else f"{n.order:.1f}"
        errors = (f"{error:.2g} {n.unit}" for error in (n.as_run_error, n.error))
        table.add_row(n.quantity, as_run, next(errors), refined, next(errors), order)
    console.print(table)
    console.print()
    for number, level in enumerate(refinement.levels, start=1):
        cells = " x ".join(f"{1e3 * size:.3g}" for size in dict.fromkeys(level.cell_m))
        effort = f"{level.nodes} nodes, {level.steps} steps, {level.elapsed_s:.1f} s"
        console.print(f"level {number}: cells of {cells} mm, {effort}", soft_wrap=True)
    for n in refinement.numbers:
        if n.order is None:
            console.print(
                f"{n.quantity}: {n.why}; the bound is from the spread of the levels", soft_wrap=True
            )
