"""Runs side by side: what differs between their cases, and what came of it; from folders alone."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from fem.errors import CaseError, Problem
from fem.result.answer import duration, span
from fem.result.case_differences import differences
from fem.result.compare_pictures import end_bars, temperatures
from fem.result.contents import Contents, read_contents
from fem.result.disk import replace
from fem.result.numbers import verdict
from fem.result.page import render

MOST_RUNS = 24


@dataclass(frozen=True)
class Outcome:
    """One run's line.

    Parameters
    ----------
    name
        What it is called here.
    title
        As its case says.
    folder
        Where it stands.
    verdict, tone
        In a word, and the class that colours it.
    time
        To the aim [s]; None where it was not reached or not asked for.
    likely
        The interval that the time lies in 19 times out of 20 [s]; None where the run does not say.
    heat_removed
        Per piece [J].
    mean, slowest
        At the end [degC].
    ice
        At the end, share of the product's mass [-]; None where nothing freezes.
    settings
        Value of each differing key, in the comparison's order.

    """

    name: str
    title: str
    folder: Path
    verdict: str
    tone: str
    time: float | None
    likely: tuple[float, float] | None
    heat_removed: float
    mean: float | None
    slowest: float
    ice: float | None
    settings: tuple[str, ...]


@dataclass(frozen=True, eq=False)
class Comparison:
    """Runs side by side.

    Parameters
    ----------
    keys
        Dotted keys whose values differ between the cases.
    outcomes
        One for each run, in the order given.
    runs
        As read, in the same order.
    remarks
        Why the runs cannot be compared without a second look, in sentences.

    """

    keys: tuple[str, ...]
    outcomes: tuple[Outcome, ...]
    runs: tuple[Contents, ...]
    remarks: tuple[str, ...]

    def sentence(self) -> str:
        """Return the answer: which run is the fastest, and by how much."""
        timed = sorted((o for o in self.outcomes if o.time is not None), key=lambda o: o.time or 0.0)
        if len(timed) < 2:
            return f"{len(timed)} of {len(self.outcomes)} runs reach their aim."
        first, last = timed[0], timed[-1]
        assert first.time is not None
        assert last.time is not None
        missed = len(self.outcomes) - len(timed)
        text = f"{first.name} is the fastest with {duration(first.time)}, {last.name} the slowest with "
        text += f"{duration(last.time)}, {100 * (last.time / first.time - 1):.0f} % more"
        return text + (f"; {missed} of {len(self.outcomes)} do not reach their aim." if missed else ".")

    def as_dict(self) -> dict[str, Any]:
        """Return the table for JSON."""
        return {
            "answer": self.sentence(),
            "keys": list(self.keys),
            "runs": self.rows(),
            "remarks": list(self.remarks),
        }

    def rows(self) -> list[dict[str, Any]]:
        """Return a row for each run: header with unit -> value, None where there is none."""
        return [
            {
                "run": o.name,
                **dict(zip(self.keys, o.settings, strict=True)),
                "time to aim [s]": o.time,
                "low [s]": o.likely[0] if o.likely else None,
                "high [s]": o.likely[1] if o.likely else None,
                "verdict": o.verdict,
                "heat_removed [J]": o.heat_removed,
                "ice_mean [-]": o.ice,
                "mean [degC]": o.mean,
                "slowest [degC]": o.slowest,
            }
            for o in self.outcomes
        ]

    def csv(self) -> str:
        """Return the table as CSV."""
        out = io.StringIO()
        rows = self.rows()
        writer = csv.writer(out, lineterminator="\n")
        writer.writerow(rows[0])
        for row in rows:
            cells = (f"{v:.9g}" if isinstance(v, float) else v for v in row.values())
            writer.writerow("" if cell is None else cell for cell in cells)
        return out.getvalue()

    def page(self) -> str:
        """Return the self-contained page."""
        curves = [(o.name, run.curves) for o, run in zip(self.outcomes, self.runs, strict=True)]
        figures = [
            {
                "title": "Slowest point",
                "svg": temperatures(curves, "slowest [degC]", "slowest in °C", self._reach()),
                "alt": f"Temperature of the slowest point against time. {self.sentence()}",
            },
            {
                "title": "Time to the aim",
                "svg": end_bars([(o.name, o.time, o.likely) for o in self.outcomes]),
                "alt": f"Time to the aim of each run, with its likely range. {self.sentence()}",
            },
            {
                "title": "Mean, once equalised",
                "svg": temperatures(curves, "mean [degC]", "mean in °C", None),
                "alt": "Temperature of the whole product, once equalised, against time.",
            },
            {
                "title": "Ice",
                "svg": temperatures(curves, "ice_mean [-]", "ice, share of the mass", None),
                "alt": "Ice in the product against time, as a share of its mass.",
            },
        ]
        return render(
            {
                "answer": self.sentence(),
                "keys": self.keys,
                "outcomes": self.outcomes,
                "figures": figures,
                "remarks": self.remarks,
                "span": span,
            },
            "compare.html.j2",
        )

    def draw(self, path: Path) -> None:
        """Draw the temperatures of the slowest points of all runs as PNG."""
        curves = [(o.name, run.curves) for o, run in zip(self.outcomes, self.runs, strict=True)]
        temperatures(curves, "slowest [degC]", "slowest in °C", self._reach(), png=path)

    def write(self, folder: str | Path) -> Path:
        """Write ``compare.html``, ``compare.csv`` and ``compare.png``.

        Parameters
        ----------
        folder
            A folder that does not exist yet.

        Returns
        -------
        The page.

        Raises
        ------
        CaseError
            Where the folder exists.
        OSError
            Where it cannot be written.

        """
        folder = Path(folder)
        if folder.exists():
            raise CaseError(str(folder), [Problem("--into", "exists; choose another folder")])
        page, table = self.page(), self.csv()
        folder.mkdir(parents=True)
        replace(folder / "compare.csv", table)
        self.draw(folder / "compare.png")
        replace(folder / "compare.html", page)
        return folder / "compare.html"

    def _reach(self) -> float | None:
        """Return the temperature to reach, where it is the same for all [degC]."""
        aims = [run.summary["aim"] for run in self.runs]
        reaches = {aim["reach_degC"] if aim else None for aim in aims}
        return reaches.pop() if len(reaches) == 1 else None


def compare(folders: Sequence[str | Path]) -> Comparison:
    """Put runs side by side.

    Parameters
    ----------
    folders
        Run folders, two at least, from this machine or another.

    Returns
    -------
    What differs between their cases, and what came of it.

    Raises
    ------
    CaseError
        Fewer than two folders, more than can be told apart, one that is no run folder.

    """
    paths = [Path(folder) for folder in folders]
    if not 2 <= len(paths) <= MOST_RUNS:
        message = f"is given {len(paths)} times; 2 to {MOST_RUNS} runs can be compared"
        raise CaseError("compare", [Problem("RUN", message)])
    problems, runs = [], []
    for path in paths:
        try:
            runs.append(read_contents(path))
        except CaseError as error:
            problems += [Problem(str(path), p.message) for p in error.problems]
    if problems:
        raise CaseError("compare", problems)
    differing = differences([run.case for run in runs])
    outcomes = tuple(
        _outcome(name, path, run, tuple(values[n] for values in differing.values()))
        for n, (name, path, run) in enumerate(zip(_names(paths), paths, runs, strict=True))
    )
    return Comparison(tuple(differing), outcomes, tuple(runs), tuple(_remarks(runs, outcomes)))


def _outcome(name: str, path: Path, run: Contents, settings: tuple[str, ...]) -> Outcome:
    summary = run.summary
    said = verdict(summary)
    aim = summary["aim"]
    last = summary["stages"][-1] if summary["stages"] else {}
    spread = (summary.get("uncertainty") or {}).get("time_s")
    return Outcome(
        name=name,
        title=summary["title"].strip() or name,
        folder=path,
        verdict=said["word"],
        tone=said["tone"],
        time=aim["time_s"] if aim else None,
        likely=(spread["low"], spread["high"]) if spread else None,
        heat_removed=summary["heat_removed_J"],
        mean=last.get("mean_degC"),
        slowest=summary["slowest"]["temperature_degC"],
        ice=last.get("ice"),
        settings=settings,
    )


def _names(paths: Sequence[Path]) -> list[str]:
    """Return the shortest ends of the paths that tell them apart; numbers where nothing does."""
    whole = [path.resolve().parts for path in paths]
    for length in range(1, max(map(len, whole)) + 1):
        names = ["/".join(parts[-length:]) for parts in whole]
        if len(set(names)) == len(names):
            return names
    return [f"{n}: {path.name}" for n, path in enumerate(paths, start=1)]


def _remarks(runs: Sequence[Contents], outcomes: Sequence[Outcome]) -> list[str]:
    """Say what makes a comparison lame."""
    said = []
    aims = {
        (run.summary["aim"]["at"], run.summary["aim"]["reach_degC"]) if run.summary["aim"] else None
        for run in runs
    }
    if len(aims) > 1:
        said.append("the runs have different aims: their times do not answer the same question")
    ends = {o.name: run.summary["time_s"] for o, run in zip(outcomes, runs, strict=True)}
    if max(ends.values()) > 1.01 * min(ends.values()):
        said.append(
            "the runs end at different times: heat, ice and temperatures at the end are not of one moment"
        )
    for o, run in zip(outcomes, runs, strict=True):
        if run.summary["outcome"] != "finished":
            said.append(f"{o.name} is not complete: {run.summary['why']}")
        said += [f"{o.name}: {why}" for why in run.missing.values()]
    versions = {run.summary["versions"].get("rimefront") for run in runs}
    if len(versions) > 1:
        said.append("the runs were made by different versions of the program")
    return said
