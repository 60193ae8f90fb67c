"""What a run is watched by: how often, at which points, along which rays, and what the front is."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Annotated, Any, Literal, Self

from pydantic import (
    AfterValidator,
    BaseModel,
    ConfigDict,
    Field,
    PlainValidator,
    WithJsonSchema,
    model_validator,
)

from fem.errors import Problem, Refused
from fem.quantity import COORDINATE, SHARE, TEMPERATURE, Duration

SLOWEST = "slowest"
"""Word for the slowest point of the product wherever a watched point may stand."""

_FRONTS = '"freezing point", an isotherm such as "-3 degC", or a share of ice such as "ice 0.3"'


@dataclass(frozen=True)
class Level:
    """The level surface that is called the front.

    Parameters
    ----------
    kind
        What is level on it.
    value
        Temperature [degC] or ice [-]; None for the freezing point, which each material has.

    """

    kind: Literal["freezing point", "temperature", "ice"]
    value: float | None = None

    @classmethod
    def read(cls, raw: Any) -> Level:
        """Return the level that a case's text means.

        Raises
        ------
        ValueError
            Any other text; says which there are.

        """
        if isinstance(raw, Level):
            return raw
        text = " ".join(raw.split()) if isinstance(raw, str) else ""
        if text == "freezing point":
            return cls("freezing point")
        if text.startswith("ice "):
            return cls("ice", _share(text.removeprefix("ice ")))
        if not re.match(r"[-+\N{MINUS SIGN}.\d]", text):
            found = f'"{raw}"' if isinstance(raw, str) else raw
            raise ValueError(f"is {_FRONTS}, got {found}")
        return cls("temperature", TEMPERATURE.read(text))


def _share(text: str) -> float:
    try:
        share = SHARE.read(text) / 100.0 if "%" in text else float(text)
    except ValueError:
        share = float("nan")
    if not 0.0 < share < 1.0:
        raise ValueError(f'a share of ice lies between 0 and 1, such as "ice 0.3", got "ice {text}"')
    return share


def _read_point(raw: Any) -> tuple[float, float]:
    if not isinstance(raw, (list, tuple)) or len(raw) != 2:
        raise ValueError('is two lengths, such as ["11 mm", "0 mm"]')
    return COORDINATE.read(raw[0]), COORDINATE.read(raw[1])


def _check_name(name: str) -> str:
    if not re.fullmatch(r"[A-Za-z0-9_-]+", name):
        raise ValueError("a name is made of letters, digits, _ and -; it heads a column")
    if name == SLOWEST:
        raise ValueError(f'"{SLOWEST}" means the slowest point of the product; choose another name')
    return name


Point = Annotated[
    tuple[float, float],
    PlainValidator(_read_point),
    WithJsonSchema(
        {
            "title": "two lengths",
            "type": "array",
            "items": COORDINATE.described(),
            "minItems": 2,
            "maxItems": 2,
            "examples": [["11 mm", "0 mm"]],
        }
    ),
]
Front = Annotated[
    Level,
    PlainValidator(Level.read),
    WithJsonSchema(
        {
            "title": _FRONTS,
            "type": "string",
            "anyOf": [
                {"const": "freezing point"},
                {"pattern": TEMPERATURE.described()["pattern"]},
                {"pattern": "^ice "},
            ],
            "default": "freezing point",
            "examples": ["-3 degC"],
        }
    ),
]
Name = Annotated[str, AfterValidator(_check_name)]


class Ray(BaseModel):
    """A straight line along which the front is measured.

    Parameters
    ----------
    from_
        First point [m]; distances count from here.
    to
        Last point [m].

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    from_: Point = Field(alias="from")
    to: Point = Field(examples=[["0 mm", "0 mm"]])

    @model_validator(mode="after")
    def _has_length(self) -> Self:
        if self.from_ == self.to:
            raise Refused([Problem("to", 'is the same point as "from"; a ray needs two')])
        return self


class Watch(BaseModel):
    """What is looked at while the run goes on.

    Parameters
    ----------
    every
        Time between rows of the curves [s], such as "5 s".
    frames
        Time between frames of the fields [s], such as "60 s".
    fields
        What they are written as: "vtu", a file for each frame, readable while the run goes on;
        "vtkhdf", all frames in one file (needs h5py); or "none".
    front
        What counts as the front: its position is measured along the rays.
    points
        Places whose temperature is recorded: name and coordinates [m], anywhere in the whole piece.
    rays
        Lines along which the front is measured, by name.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    every: Duration = 5.0
    frames: Duration = 60.0
    fields: Literal["vtu", "vtkhdf", "none"] = "vtu"
    front: Front = Level("freezing point")
    points: dict[Name, Point] = {}
    rays: dict[Name, Ray] = {}
