"""Mistakes and failures, each said so that its reader can mend it."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True)
class Problem:
    """One mistake in an input: where it stands and what would be right.

    Parameters
    ----------
    place
        Dotted key as the case file has it, list entries by name ("stages.freeze.lasts").
    message
        What is wrong, what was found with its unit, what would be right.
    line
        Line of the file, counted from 1, where it is known.

    """

    place: str
    message: str
    line: int | None = None


class CaseError(Exception):
    """The case, or the command line, is wrong; holds every problem that was found.

    Parameters
    ----------
    source
        What was read: the file's name as the user typed it.
    problems
        All of them, in the order of their lines.

    """

    def __init__(self, source: str, problems: Iterable[Problem]):
        self.source = source
        self.problems = sorted(problems, key=lambda p: (p.line is None, p.line or 0))
        super().__init__(str(self))

    def __str__(self) -> str:
        count = len(self.problems)
        place = max((len(p.place) for p in self.problems), default=0)
        lines = [f"{self.source}: {count} problem{'s' if count != 1 else ''}"]
        for p in self.problems:
            number = "" if p.line is None else str(p.line)
            lines.append(f"{number:>5}  {p.place:<{place}}  {p.message}".rstrip())
        return "\n".join(lines)


class Refused(ValueError):
    """Mistakes within one table of a case, found when its keys are looked at together.

    Parameters
    ----------
    problems
        Their places are relative to the table ("corner"); "" is the table itself.

    """

    def __init__(self, problems: Iterable[Problem]):
        self.problems = tuple(problems)
        super().__init__("; ".join(f"{p.place}: {p.message}" for p in self.problems))


@dataclass
class RunFailure(Exception):
    """A run that could not go on.

    Parameters
    ----------
    why
        A sentence: what happened.
    time
        Time since the run began [s].
    where
        Node and surface, in words; empty where it is not known.
    causes
        Likely causes, the likeliest first.
    kept
        What was written before and can be used.
    unknown
        Number of the unknown that is to blame, for those who can say where that is.

    """

    why: str
    time: float
    where: str = ""
    causes: tuple[str, ...] = ()
    kept: str = ""
    unknown: int | None = None

    def __str__(self) -> str:
        parts = [f"at {self.time:.6g} s {self.where}".rstrip() + f": {self.why}"]
        if self.causes:
            parts.append("Likely: " + "; ".join(self.causes) + ".")
        if self.kept:
            parts.append(self.kept)
        return " ".join(parts)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """Return the known word that a misspelt one most likely meant, or None."""
    found = difflib.get_close_matches(word, list(known), n=1, cutoff=0.6)
    return found[0] if found else None


def unknown(what: str, word: str, known: Iterable[str]) -> str:
    """Say that a word is not known, which ones are, and which was probably meant."""
    names = list(known)
    text = f'no {what} "{word}" (there is: {", ".join(names) if names else "none"})'
    guess = nearest(word, names)
    return text + (f'; did you mean "{guess}"?' if guess else "")
