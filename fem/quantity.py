"""Numbers with units, as a case file writes them: text in, SI (and degC) out.

A value is read as number and unit and then converted, never handed to the unit library whole:
``"300 W/m2/degC"`` has to be 300 W/m2/K, and an offset conversion would make it 1.09.
"""

from __future__ import annotations

import math
import re
import tokenize
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Annotated, Any

from pydantic_core import PydanticCustomError, core_schema

if TYPE_CHECKING:
    import pint

_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?|[+-]?inf|nan)(?![\d.,])\s*(.*)")
# For editors, in the regular expressions that JSON Schema shares with them. A unit does not begin
# like the rest of a number, so that "22", "1e5" and "0,8 mm" have none.
_NUMBER_PATTERN = r"[-+−]?(\d+\.?\d*|\.\d+)([eE][-+]?\d+)?"
_UNIT_PATTERN = r"[^-+\d\s.,eE]"
_TEMPERATURE_UNITS = ("degC", "degF", "K")


@dataclass(frozen=True)
class Kind:
    """What sort of quantity a key takes: its unit inside, and the values that make sense.

    Used as a pydantic annotation, ``Annotated[float, Kind(...)]``; the value that comes out is a
    float in `unit`.

    Parameters
    ----------
    name
        In words ("length").
    unit
        Unit inside the program, which is also the one that messages ask for.
    example
        How a value is written.
    above, least, most
        Bounds in `unit`: strictly above, at least, at most; None for no bound.

    """

    name: str
    unit: str
    example: str
    above: float | None = None
    least: float | None = None
    most: float | None = None

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        """Read text into a float in `unit`; floats made by our own code pass as they are."""
        return core_schema.no_info_plain_validator_function(
            self.read,
            serialization=core_schema.to_string_ser_schema(),
            metadata={"unit": self.unit, "example": self.example},
        )

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        """Describe the value for editors."""
        return self.described()

    def described(self) -> dict[str, Any]:
        """Return the JSON Schema of a value: text with number and unit; bare numbers do not fit."""
        bare = self.unit == "1"
        return {
            "title": self.name,
            "type": ["string", "number"] if bare else "string",
            "pattern": rf"^\s*{_NUMBER_PATTERN}\s*{'' if bare else _UNIT_PATTERN}",
            "examples": [self.example],
        }

    def written(self, value: float) -> str:
        """Return a value as a case would have it: ``"60 s"``; 0 in the unit of the example."""
        unit = self.unit if value else self.example.partition(" ")[2]
        return f"{value:g} {unit.replace('percent', '%').removeprefix('1')}".rstrip()

    def read(self, raw: Any) -> float:
        """Return the value in `unit`; raise PydanticCustomError with the remedy."""
        value = read_quantity(raw, self)
        self.check(value, raw)
        return value

    def check(self, value: float, raw: Any) -> None:
        """Raise PydanticCustomError where the value is outside the bounds."""
        shown = _bound(self.unit)
        if self.above is not None and not value > self.above:
            raise _wrong(f"must be above {shown(self.above)}, got {raw}")
        if self.least is not None and value < self.least:
            raise _wrong(f"must be at least {shown(self.least)}, got {raw}")
        if self.most is not None and value > self.most:
            raise _wrong(f"must be at most {shown(self.most)}, got {raw}")


def read_quantity(raw: Any, kind: Kind) -> float:
    """Convert ``"22 mm"`` to a float in the unit of `kind`.

    Raises
    ------
    PydanticCustomError
        Bare numbers, missing, unknown or wrong units, NaN and infinities; the message says what
        would be right.

    """
    if isinstance(raw, bool) or not isinstance(raw, (str, int, float)):
        raise _wrong(f'must be a {kind.name} with its unit, such as "{kind.example}"')
    if not isinstance(raw, str):
        if kind.unit == "1" and math.isfinite(raw):
            return float(raw)
        raise _wrong(f'a bare number ({raw!r}) has no unit; write it as text, such as "{kind.example}"')
    text = raw.replace("\N{MINUS SIGN}", "-").strip()
    match = _NUMBER.fullmatch(text)
    if match is None:
        comma = re.match(r"[+-]?\d+,\d", text)
        remedy = (
            "write the decimal sign as a point"
            if comma
            else f'write a number and a unit, such as "{kind.example}"'
        )
        raise _wrong(f'"{raw}" cannot be read as a {kind.name}; {remedy}')
    number, unit = float(match[1]), match[2].strip()
    value = convert(number, unit, kind) if math.isfinite(number) else number
    if not math.isfinite(value):
        raise _wrong(f'"{raw}" is not a finite number')
    return value


def convert(number: float, unit: str, kind: Kind) -> float:
    """Convert one number from a unit as typed to the unit of `kind` (see `converter`)."""
    return converter(unit, kind)(number)


@cache
def converter(unit: str, kind: Kind) -> Callable[[float], float]:
    """Return the function that takes values in a typed unit to the unit of `kind`.

    It works on arrays too, so that a column of a table is converted at once.

    Raises
    ------
    PydanticCustomError
        Missing, unknown or wrong unit.

    """
    typed = unit.replace("°", "deg").strip()
    expected = f'a {kind.name} is written like "{kind.example}"'
    if not typed:
        if kind.unit == "1":
            return lambda x: x
        raise _wrong(f"has no unit; {expected}")
    if kind.unit == "degC":
        if typed not in _TEMPERATURE_UNITS:
            raise _wrong(f'"{unit}" is no unit of temperature; {expected} (or in degF or K)')
        if typed == "degC":
            return lambda x: x
        return (lambda x: x - 273.15) if typed == "K" else (lambda x: (x - 32.0) / 1.8)
    if typed in ("degC", "degF") and kind.unit == "K":
        raise _wrong(f'"{unit}" reads as a temperature, not as a difference; {expected}')
    found = _unit(typed)
    if found is None:
        raise _wrong(f'"{unit}" is no unit that is known here; {expected}')
    wanted = _unit(kind.unit)
    assert wanted is not None
    if found.dimensionality != wanted.dimensionality:
        raise _wrong(f'"{unit}" is no unit of {kind.name}; {expected}')
    factor = _factor(found, wanted)
    return lambda x: x * factor


def _unit(text: str) -> pint.Unit | None:
    """Parse a unit in the short spelling of engineers: ``W/m2/K``, ``kg/m3``, ``W/(m2 K)``."""
    import pint

    spelled = text.replace("^", "**").replace("²", "**2").replace("³", "**3").replace("·", "*")
    spelled = re.sub(r"(?<=[A-Za-z])(\d)", r"**\1", spelled)
    spelled = re.sub(r"(?<=[\w)])\s+(?=[A-Za-z(])", "*", spelled)
    # Inside a compound unit a degree is a difference, whatever its zero.
    spelled = re.sub(r"\bdeg([CF])\b", r"delta_deg\1", spelled)
    if spelled == "1":
        spelled = "dimensionless"
    # A power of a number, or a number of two digits, is no unit and could take for ever to work out.
    if not re.fullmatch(r"[\w%*/().\s-]+", spelled) or re.search(r"\d[\d.]|[\d)]\s*\*\*", spelled):
        return None
    try:
        return _registry().parse_units(spelled)
    except (pint.errors.PintError, tokenize.TokenError, ValueError, TypeError, AttributeError, KeyError):
        return None
    except (AssertionError, ArithmeticError):  # what the parser makes of "m/" and of "m/0"
        return None


def _factor(found: pint.Unit, wanted: pint.Unit) -> float:
    return float(_registry().Quantity(1.0, found).to(wanted).magnitude)


@cache
def _registry() -> pint.UnitRegistry:
    import pint

    return pint.UnitRegistry()


def _bound(unit: str) -> Callable[[float], str]:
    if unit == "1":
        return lambda x: f"{x:.4g}"
    if unit == "percent":
        return lambda x: f"{x:.4g} %"
    return lambda x: f"{x:.4g} {unit}" if x else "0"


def _wrong(message: str) -> PydanticCustomError:
    # Braces would be read as fields of the message's template.
    return PydanticCustomError("quantity", "{said}", {"said": message})


ABSOLUTE_ZERO = -273.15

LENGTH = Kind("length", "m", "22 mm", above=0.0, most=100.0)
COORDINATE = Kind("length", "m", "11 mm")
DURATION = Kind("time", "s", "20 min", above=0.0)
MOMENT = Kind("time", "s", "0 s", least=0.0)
TEMPERATURE = Kind("temperature", "degC", "-22 degC", least=ABSOLUTE_ZERO, most=1000.0)
DIFFERENCE = Kind("temperature difference", "K", "2 K", above=0.0)
DENSITY = Kind("density", "kg/m3", "1075 kg/m3", above=0.0)
HEAT_CAPACITY = Kind("heat capacity", "J/kg/K", "480 J/kg/K", above=0.0)
CONDUCTIVITY = Kind("conductivity", "W/m/K", "16 W/m/K", above=0.0)
COEFFICIENT = Kind("heat transfer coefficient", "W/m2/K", "250 W/m2/K", above=0.0)
FLUX = Kind("heat flux", "W/m2", "500 W/m2")
LATENT_HEAT = Kind("latent heat", "J/kg", "334 kJ/kg", above=0.0)
SHARE = Kind("share", "percent", "18 %", least=0.0, most=100.0)
FACTOR = Kind("factor", "1", "1.1", above=0.0)
EMISSIVITY = Kind("emissivity", "1", "0.9", above=0.0, most=1.0)

Length = Annotated[float, LENGTH]
Coordinate = Annotated[float, COORDINATE]
Duration = Annotated[float, DURATION]
Moment = Annotated[float, MOMENT]
Temperature = Annotated[float, TEMPERATURE]
Difference = Annotated[float, DIFFERENCE]
Density = Annotated[float, DENSITY]
HeatCapacity = Annotated[float, HEAT_CAPACITY]
Conductivity = Annotated[float, CONDUCTIVITY]
Coefficient = Annotated[float, COEFFICIENT]
Flux = Annotated[float, FLUX]
LatentHeat = Annotated[float, LATENT_HEAT]
Share = Annotated[float, SHARE]
Factor = Annotated[float, FACTOR]
Emissivity = Annotated[float, EMISSIVITY]
