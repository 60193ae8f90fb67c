"""A case: what is frozen, how, for how long, and what is asked of it. Frozen, checked, in SI."""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import Annotated, Any, Self

from pydantic import BaseModel, ConfigDict, Field, PlainValidator, WithJsonSchema, model_validator

from fem.errors import Problem, Refused
from fem.heat.exchange import Exchange
from fem.march.control import Stepping
from fem.mesh.form import Section
from fem.mesh.shape import Shape
from fem.quantity import TEMPERATURE, Duration, Length, Temperature
from fem.watch.schedule import Watch

_UNTIL = re.compile(r"\s*(?:point\.)?([A-Za-z0-9_-]+)\s*(<=|>=)\s*(.+?)\s*")


class Piece(BaseModel):
    """What one piece is, apart from its shape.

    Parameters
    ----------
    section
        Whether the shape is in (x, y) or in (r, z).
    length
        How long a plane piece is along the normal [m], such as "83 mm": heat and mass are per piece.
        Left out where the section is axisymmetric.
    start_temperature
        Temperature at the start of every region that `start` does not name [degC], such as "4 degC".
    start
        Temperatures at the start [degC], by region.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    section: Section
    length: Length | None = None
    start_temperature: Temperature | None = None
    start: dict[str, Temperature] = {}

    @model_validator(mode="after")
    def _length_fits(self) -> Self:
        if self.section == "plane" and self.length is None:
            message = 'is missing: heat and mass of a plane piece need its length, such as "83 mm"'
            raise Refused([Problem("length", message)])
        if self.section == "axisymmetric" and self.length is not None:
            message = "has no meaning for an axisymmetric piece, which is a full revolution; leave it out"
            raise Refused([Problem("length", message)])
        return self

    def start_of(self, region: str) -> float:
        """Return the start temperature of a region [degC]."""
        start = self.start.get(region, self.start_temperature)
        assert start is not None, "a case is checked for this when read"
        return start


@dataclass(frozen=True)
class Until:
    """What ends a stage before its time is up.

    Parameters
    ----------
    at
        "slowest", or the name of a watched point.
    below
        Whether the temperature has to fall to `temperature`; else to rise to it.
    temperature
        [degC].

    """

    at: str
    below: bool
    temperature: float

    @classmethod
    def read(cls, raw: Any) -> Until:
        """Return the condition that a case's text means, such as ``"slowest <= -12 degC"``.

        Raises
        ------
        ValueError
            Any other text; PydanticCustomError where the temperature is wrong.

        """
        if isinstance(raw, Until):
            return raw
        match = _UNTIL.fullmatch(raw) if isinstance(raw, str) else None
        if match is None:
            found = f'"{raw}"' if isinstance(raw, str) else raw
            form = 'is written like "slowest <= -12 degC": a point, <= or >=, a temperature'
            raise ValueError(f"{form}; got {found}")
        return cls(match[1], match[2] == "<=", TEMPERATURE.read(match[3]))


_CONDITION = WithJsonSchema(
    {"title": "condition", "type": "string", "pattern": "[<>]=", "examples": ["slowest <= -12 degC"]}
)


class Stage(BaseModel):
    """One stage: what each surface meets, and for how long.

    Parameters
    ----------
    name
        Name of the stage, said in the answer and used by overrides.
    lasts
        How long it lasts at most [s].
    until
        What may end it earlier: "slowest" or a watched point, <= or >=, a temperature. If it is not
        met in time, the stage ends all the same and a caution says so.
    surfaces
        What each surface meets, by its name; a surface without entry is insulated.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    name: Annotated[str, Field(min_length=1, examples=["freeze"])]
    lasts: Duration
    until: Annotated[Until, PlainValidator(Until.read), _CONDITION] | None = None
    surfaces: dict[str, Exchange] = {}


class Aim(BaseModel):
    """The question of the case: a temperature to reach, in time.

    Parameters
    ----------
    at
        Where: "slowest", the slowest point of the product, or the name of a watched point.
    reach
        Temperature to reach [degC], such as "-12 degC".
    within
        Time since the run began [s]; any time will do if left out.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    at: str = "slowest"
    reach: Temperature
    within: Duration | None = None


@dataclass(frozen=True)
class Case:
    """A case file as read: every number in SI, temperatures in degC.

    Parameters
    ----------
    schema
        Version of the case language.
    title
        What is asked, in the user's words.
    piece, shape
        What is frozen.
    regions
        Region of the shape -> name of its material.
    materials
        Name -> material as given.
    stages
        In their order; one at least.
    watch, aim, stepping
        What is looked at, what is asked, how closely time is followed.
    text
        The case as run, overrides applied.
    source
        What was read, as the user named it.
    folder
        Where the files that the case names are looked for.
    uncertainty
        Key -> half-width of the interval that its value lies in 19 times out of 20 (a
        `fem.case.shift.Spread`); None where the case does not say.

    """

    schema: int
    title: str
    piece: Piece
    shape: Shape
    regions: dict[str, str]
    materials: dict[str, Any]
    stages: tuple[Stage, ...]
    watch: Watch
    aim: Aim | None
    stepping: Stepping
    text: str = field(repr=False)
    source: str
    folder: Path
    uncertainty: dict[str, Any] | None = None

    @property
    def lasts(self) -> float:
        """Longest duration of the whole run [s]."""
        return sum(stage.lasts for stage in self.stages)
