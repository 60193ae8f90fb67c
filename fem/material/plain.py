"""`kind = "plain"`: a material that does not freeze: a mould wall, a stick, a film."""

from __future__ import annotations

from typing import Annotated, Any, Literal

import numpy as np
from pydantic import BaseModel, ConfigDict, ValidatorFunctionWrapHandler, WrapValidator, model_validator

from fem.column import Column, holds
from fem.curve import Curve
from fem.errors import Problem, Refused
from fem.material.material import Material
from fem.material.table import falls
from fem.quantity import ABSOLUTE_ZERO, CONDUCTIVITY, HEAT_CAPACITY, TEMPERATURE, Density, Kind


class _Rows(BaseModel):
    """A property against temperature: straight lines between rows, held beyond.

    Parameters
    ----------
    temperature
        Temperatures of the rows, rising [degC].
    value
        The property at these temperatures.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    temperature: Annotated[Column, holds(TEMPERATURE)]
    value: Column

    @model_validator(mode="after")
    def _pairs(self) -> _Rows:
        if len(self.value) != len(self.temperature):
            message = f"has {len(self.value)} values, but temperature has {len(self.temperature)}"
            raise Refused([Problem("value", message)])
        if (said := falls(self.temperature, TEMPERATURE)) is not None:
            raise Refused([Problem("temperature", said)])
        return self


class HeatCapacityRows(_Rows):
    """Heat capacity [J/kg/K] against temperature [degC]."""

    value: Annotated[Column, holds(HEAT_CAPACITY)]


class ConductivityRows(_Rows):
    """Conductivity [W/m/K] against temperature [degC]."""

    value: Annotated[Column, holds(CONDUCTIVITY)]


def _or_value(kind: Kind, table: type[_Rows]) -> WrapValidator:
    """Take a table as it is, and a single quantity as one row that is held everywhere."""

    def read(raw: Any, handler: ValidatorFunctionWrapHandler) -> Any:
        if isinstance(raw, (dict, _Rows)):
            return handler(raw)
        value = {"unit": kind.unit, "values": [kind.read(raw)]}
        return handler({"temperature": {"unit": "degC", "values": [0.0]}, "value": value})

    return WrapValidator(read, json_schema_input_type=Annotated[float, kind] | table)


class Plain(BaseModel):
    """A material without freezing.

    Parameters
    ----------
    density
        Density [kg/m3], such as "7900 kg/m3".
    heat_capacity
        Heat capacity [J/kg/K]: a value, or values against temperature.
    conductivity
        Conductivity [W/m/K]: a value, or values against temperature.

    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    kind: Literal["plain"] = "plain"
    density: Density
    heat_capacity: Annotated[HeatCapacityRows, _or_value(HEAT_CAPACITY, HeatCapacityRows)]
    conductivity: Annotated[ConductivityRows, _or_value(CONDUCTIVITY, ConductivityRows)]

    def build(self) -> Material:
        """Return the material; enthalpy 0 at 0 degC."""
        T_c, T_k = (rows.temperature.in_unit(TEMPERATURE) for rows in (self.heat_capacity, self.conductivity))
        T = np.union1d(T_c, T_k)
        c = np.interp(T, T_c, self.heat_capacity.value.in_unit(HEAT_CAPACITY))
        k = np.interp(T, T_k, self.conductivity.value.in_unit(CONDUCTIVITY))
        known = [rows for rows in (T_c, T_k) if len(rows) > 1]
        return Material(
            kind=self.kind,
            curve=Curve.from_capacity(T, self.density * c, k),
            density=self.density,
            range=(
                max((float(rows[0]) for rows in known), default=ABSOLUTE_ZERO),
                min((float(rows[-1]) for rows in known), default=float(TEMPERATURE.most or np.inf)),
            ),
            freezes=False,
        )
