"""The command line: each command is one call into the library."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from fem.errors import CaseError, Problem, RunFailure

if TYPE_CHECKING:
    from fem.case.case import Case

FAILED, WRONG, PART_FAILED, INTERRUPTED = 1, 2, 3, 130


def main() -> None:
    """Run the command line and leave with its exit code."""
    # Two threads are slower than one on matrices of this size; this has to stand before numpy.
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")
    try:
        sys.exit(rimefront.main(standalone_mode=False) or 0)
    except click.exceptions.Abort:
        _say("interrupted")
        sys.exit(INTERRUPTED)
    except KeyboardInterrupt:
        _say("interrupted")
        sys.exit(INTERRUPTED)
    except click.ClickException as error:
        error.show()
        sys.exit(WRONG)
    except CaseError as error:
        _say(str(error))
        sys.exit(WRONG)
    except RunFailure as error:
        _say(f"The run failed {error}")
        sys.exit(FAILED)
    except OSError as error:
        _say(f"{error.filename or 'a file'}: {error.strerror or error}; what was already written is kept")
        sys.exit(FAILED)


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(package_name="rimefront")
def rimefront() -> None:
    """How long a moulded water-ice piece takes to freeze, where it is slowest, and what it hangs on."""


_CASE = click.argument("case", type=click.Path(path_type=Path))
_SET = click.option(
    "--set", "overrides", multiple=True, metavar="KEY=VALUE", help="Change a key, stages by their name."
)


@rimefront.command()
@_CASE
@_SET
@click.option("--into", type=click.Path(path_type=Path), help="Folder to write; by default runs/CASE.")
@click.option("--overwrite", is_flag=True, help="Replace the run folder given with --into.")
@click.option("--json", "as_json", is_flag=True, help="Print summary.json; text goes to standard error.")
@click.option("--no-report", is_flag=True, help="Leave report.html out; rimefront report writes it later.")
def run(
    case: Path, overrides: tuple[str, ...], into: Path | None, overwrite: bool, as_json: bool, no_report: bool
) -> None:
    """Run CASE and say when its slowest point is cold enough."""
    from fem.case.read import load
    from fem.result.folder import fresh
    from fem.run import run as run_case
    from fem.terminal import Progress, show_answer, show_json

    read: Case = load(case, overrides)
    folder = into if into is not None else fresh(case.stem)
    with Progress(read.lasts) as progress:
        result = run_case(read, folder, overwrite=overwrite, progress=progress)
    try:
        if not no_report:
            _report_of(folder)
    finally:
        if as_json:
            show_json(result.summary)
        show_answer(result, to_stderr=as_json)


@rimefront.command()
@click.argument("folder", metavar="RUN", type=click.Path(path_type=Path))
@click.option("--into", type=click.Path(path_type=Path), help="File to write; by default report.html in RUN.")
def report(folder: Path, into: Path | None) -> None:
    """Write the report of a run folder again, from the folder alone."""
    from fem.result.report import write_report

    click.echo(write_report(folder, into))


@rimefront.command()
@_CASE
@_SET
@click.option("--json", "as_json", is_flag=True, help="Print it as JSON; text goes to standard error.")
def check(case: Path, overrides: tuple[str, ...], as_json: bool) -> None:
    """Read and mesh CASE and say what is known without a run."""
    from fem.case.read import load
    from fem.estimate.outlook import outlook
    from fem.terminal import show_json, show_outlook

    said = outlook(load(case, overrides))
    if as_json:
        show_json(said)
    show_outlook(said, to_stderr=as_json)


@rimefront.command()
@_CASE
@_SET
@click.option("--json", "as_json", is_flag=True, help="Print it as JSON; text goes to standard error.")
def refine(case: Path, overrides: tuple[str, ...], as_json: bool) -> None:
    """Run CASE on three levels of cells and steps and say how far off its numbers are."""
    from rich.console import Console

    from fem.case.read import load
    from fem.series.refine import refine as refine_case
    from fem.terminal import show_json, show_refinement

    with Console(stderr=True).status("") as status:
        refined = refine_case(load(case, overrides), progress=status.update)
    if as_json:
        show_json(refined.as_dict())
    show_refinement(refined, to_stderr=as_json)


@rimefront.command()
@click.argument("plan", type=click.Path(path_type=Path))
@click.option("--into", type=click.Path(path_type=Path), help="Folder to write; by default sweeps/PLAN.")
@click.option("--processes", type=click.IntRange(min=1), help="How many; by default one per processor.")
@click.option("--cluster", metavar="ADDRESS", help="dask.distributed scheduler to run on: tcp://HOST:8786.")
@click.option("--json", "as_json", is_flag=True, help="Print sweep.json; text goes to standard error.")
def sweep(plan: Path, into: Path | None, processes: int | None, cluster: str | None, as_json: bool) -> None:
    """Run every case of PLAN that has not been run yet, and draw the operating window."""
    from fem.series.sweep import sweep as sweep_plan
    from fem.series.sweep_plan import read_plan
    from fem.terminal import SweepProgress, show_json, show_sweep

    read = read_plan(plan)
    with SweepProgress() as progress:
        swept = sweep_plan(read, into, processes=processes, cluster=cluster, progress=progress)
    if as_json:
        show_json(swept.summary)
    show_sweep(swept, to_stderr=as_json)
    if swept.failed:
        raise SystemExit(PART_FAILED)


@rimefront.command()
@_CASE
@_SET
@click.option("--vary", required=True, metavar="KEY", help="Dotted key of the quantity to set.")
@click.option("--between", required=True, nargs=2, metavar="A B", help='Interval: "-30 degC" "-15 degC".')
@click.option("--with-margin", is_flag=True, help="Meet the aim at the unfavourable end of the time's range.")
@click.option("--json", "as_json", is_flag=True, help="Print it as JSON; text goes to standard error.")
def setpoint(
    case: Path,
    overrides: tuple[str, ...],
    vary: str,
    between: tuple[str, str],
    with_margin: bool,
    as_json: bool,
) -> None:
    """Find the value of an input with which CASE just meets its aim."""
    from rich.console import Console

    from fem.answers import show_setpoint
    from fem.case.read import load
    from fem.series.setpoint import setpoint as find
    from fem.terminal import show_json

    read = load(case, overrides)
    with Console(stderr=True).status("") as status:
        found = find(read, vary, between, with_margin=with_margin, progress=status.update)
    if as_json:
        show_json(found.as_dict())
    show_setpoint(found, case, to_stderr=as_json)


@rimefront.command()
@_CASE
@_SET
@click.option("--log", "logs", required=True, multiple=True, help="A thermocouple's log; may be repeated.")
@click.option(
    "--fit", "fitted", multiple=True, help="h (default), freezing_point, conductivity_factor, a key."
)
@click.option("--point", "points", multiple=True, help="Watched point of each log; by default the first.")
@click.option("--column", "columns", multiple=True, help="Column of each log that holds several probes.")
@click.option("--pour", metavar="TIME", help='When the mix was poured: "14:03:20" or "35 s" into the log.')
@click.option("--unit", help="Unit of the logs' temperatures where they do not say it.")
@click.option("--into", type=click.Path(path_type=Path), help="Folder to write; by default runs/CASE-fit.")
@click.option("--json", "as_json", is_flag=True, help="Print it as JSON; text goes to standard error.")
def fit(
    case: Path,
    overrides: tuple[str, ...],
    logs: tuple[str, ...],
    fitted: tuple[str, ...],
    points: tuple[str, ...],
    columns: tuple[str, ...],
    pour: str | None,
    unit: str | None,
    into: Path | None,
    as_json: bool,
) -> None:
    """Fit h, freezing point or conductivity of CASE to thermocouple logs, and write the fitted case."""
    from rich.console import Console

    from fem.answers import show_fit
    from fem.case.read import load
    from fem.result.folder import fresh
    from fem.series.fit import fit as fit_case
    from fem.terminal import show_json

    if into is not None and into.exists():
        raise CaseError(str(into), [Problem("--into", "exists; choose another folder")])
    read = load(case, overrides)
    with Console(stderr=True).status("") as status:
        found = fit_case(
            read,
            logs,
            fitted=fitted or ("h",),
            points=points,
            columns=columns,
            pour=pour,
            unit=unit,
            progress=status.update,
        )
    written = found.write(into if into is not None else fresh(f"{case.stem}-fit"))
    if as_json:
        show_json(found.as_dict())
    show_fit(found, written, to_stderr=as_json)


@rimefront.command()
@click.argument("folders", metavar="RUN RUN...", nargs=-1, required=True, type=click.Path(path_type=Path))
@click.option("--into", type=click.Path(path_type=Path), help="Folder to write; by default runs/comparison.")
@click.option("--json", "as_json", is_flag=True, help="Print the table as JSON; text goes to standard error.")
def compare(folders: tuple[Path, ...], into: Path | None, as_json: bool) -> None:
    """Put run folders side by side: what differs between their cases, and what came of it."""
    from fem.answers import show_comparison
    from fem.result.compare import compare as compare_runs
    from fem.result.folder import fresh
    from fem.terminal import show_json

    found = compare_runs(folders)
    written = found.write(into if into is not None else fresh("comparison"))
    if as_json:
        show_json(found.as_dict())
    show_comparison(found, written, to_stderr=as_json)


@rimefront.command()
@click.option("--json", "as_json", is_flag=True, help="Print the lines as JSON.")
def verify(as_json: bool) -> None:
    """Run the solver against exact solutions and print what each says, what ours is, and the error."""
    from fem.series.verify import verify as verify_all
    from fem.terminal import show_verdicts

    if not show_verdicts(verify_all(), as_json):
        raise SystemExit(FAILED)


@rimefront.command()
@click.argument("folder", metavar="RUN", type=click.Path(path_type=Path))
@click.option("--picture", type=click.Path(path_type=Path), help="PNG file to draw instead of a window.")
@click.option("--array", default="temperature_degC", show_default=True, help="Field to show.")
@click.option("--time", help='Time to show, such as "10 min"; by default the end.')
def show(folder: Path, picture: Path | None, array: str, time: str | None) -> None:
    """Show the fields of a run folder in a window with a time slider, or draw a picture."""
    from fem.quantity import MOMENT
    from fem.result.view import CannotDraw, window
    from fem.result.view import picture as draw_picture

    try:
        moment = None if time is None else MOMENT.read(time)
    except ValueError as error:
        raise CaseError("show", [Problem("--time", str(error))]) from error
    try:
        if picture is None:
            window(folder, array, moment)
        else:
            click.echo(draw_picture(folder, picture, array, moment))
    except CannotDraw as error:
        _say(str(error))
        raise SystemExit(FAILED) from error


@rimefront.command()
@click.argument("product", metavar="bar|tube")
@click.option("--into", type=click.Path(path_type=Path), help="File to write; by default standard output.")
def draft(product: str, into: Path | None) -> None:
    """Write a commented starter case that runs as it is."""
    from fem.case.draft import draft as draft_of

    text = draft_of(product)
    if into is None:
        click.echo(text, nl=False)
        return
    try:
        with into.open("x", encoding="utf-8") as file:
            file.write(text)
    except FileExistsError as error:
        message = "exists already and is left as it is; choose another name"
        raise CaseError(str(into), [Problem("--into", message)]) from error
    _say(f"{into} is written; next: rimefront run {into}")


@rimefront.command()
def schema() -> None:
    """Print the JSON Schema of case files, for editors."""
    import json

    from fem.case.schema import schema as schema_of

    click.echo(json.dumps(schema_of(), indent=2, ensure_ascii=False))


def _report_of(folder: Path) -> None:
    """Write the report of a run that has just ended; its answer is worth more than its page."""
    try:
        from fem.result.report import write_report

        write_report(folder)
    except OSError:
        raise
    # Whatever else goes wrong with a picture, the run is done and its answer follows.
    except Exception as error:
        _say(f"report.html is left out: {error}; the run is complete, rimefront report {folder} tries again")


def _say(text: Any) -> None:
    click.echo(text, err=True)


if __name__ == "__main__":
    main()
