"""What the solver, the observers and the hand estimates know of a material."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fem.curve import Curve

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Material:
    """One material, ready to be computed with; temperatures in degC.

    Parameters
    ----------
    kind
        The word of the case file: "recipe", "melting", "table", "plain".
    curve
        Enthalpy [J/m3], conductivity [W/m/K] and its integral against temperature.
    density
        Mass per volume as poured [kg/m3]; held at every temperature.
    range
        Temperatures between which the properties hold.
    freezes
        Whether it can hold ice; False for `plain`.
    freezing_point
        Where ice first appears; the melting point of `melting`; None where it has none or a
        table does not state it.
    melting_point
        Of `melting`; else None. A start at this temperature is liquid.
    melting_range
        Width of the melting of `melting`, centred on the melting point [K]; else 0.
    ice_rows
        Temperatures and ice share of the product's mass, straight lines between and held
        beyond; None where it is not known.
    latent_rows
        Temperatures and latent heat given up since the liquid [J/m3], likewise.
    cautions
        What a reader of the results should know about the inputs; sentences.

    """

    kind: str
    curve: Curve
    density: float
    range: tuple[float, float]
    freezes: bool
    freezing_point: float | None = None
    melting_point: float | None = None
    melting_range: float = 0.0
    ice_rows: tuple[Array, Array] | None = None
    latent_rows: tuple[Array, Array] | None = None
    cautions: tuple[str, ...] = ()

    @property
    def has_ice(self) -> bool:
        """Whether its ice share is known: a plain material holds none, a table may not say."""
        return not self.freezes or self.ice_rows is not None

    def ice(self, T: ArrayLike) -> Array:
        """Ice mass over product mass [-] at T, shape of `T`.

        0 for a plain material; NaN for a table without a column of ice (see `has_ice`).
        """
        T = np.asarray(T, dtype=float)
        if self.ice_rows is not None:
            return np.asarray(np.interp(T, *self.ice_rows))
        return np.full(T.shape, math.nan if self.freezes else 0.0)

    @property
    def freezable(self) -> float:
        """The most ice it can hold, as a share of its mass [-]; NaN where it is not known."""
        if self.ice_rows is None:
            return math.nan if self.freezes else 0.0
        return float(np.max(self.ice_rows[1]))

    def start_enthalpy(self, T: float) -> float:
        """Enthalpy of a piece that starts at T [J/m3].

        A start at the melting point itself is liquid: the enthalpy of the upper end of the
        melting range. Elsewhere in a wide range it is partly frozen, as the curve has it.
        """
        if self.melting_point is not None:
            near = min(self.melting_range / 2.0, 0.5e-3) * (1.0 + 1e-9)
            if abs(T - self.melting_point) <= near:
                return float(self.curve.enthalpy(self.melting_point + self.melting_range / 2.0))
        return float(self.curve.enthalpy(T))

    def front_enthalpy(self) -> float | None:
        """Enthalpy at the front "freezing point" [J/m3]; None where no freezing point is known.

        For `melting` half of what can freeze has frozen there; else ice is about to appear.
        """
        return None if self.freezing_point is None else float(self.curve.enthalpy(self.freezing_point))

    def heat(self, start: float, end: float) -> float:
        """Heat given up between two temperatures [J/m3]; positive where it cools."""
        return self.start_enthalpy(start) - float(self.curve.enthalpy(end))

    def latent_heat(self, T: float | None = None) -> float:
        """Latent heat given up on the way from liquid to T [J/m3], by default all there is.

        For `recipe` the integral of L(T) over the ice that forms, for `melting` the stated heat
        times the density. A table does not tell latent from sensible heat: what its enthalpy
        falls by between the freezing point and T beyond the heat capacity of its coldest rows,
        and NaN where it states no freezing point. 0 for a plain material.
        """
        if not self.freezes:
            return 0.0
        if self.latent_rows is not None:
            return float(np.interp(-math.inf if T is None else T, *self.latent_rows))
        if self.freezing_point is None:
            return math.nan
        coldest = float(self.curve.T[0])
        end = max(coldest, coldest if T is None else T)
        fall = self.curve.enthalpy(self.freezing_point) - self.curve.enthalpy(end)
        return max(0.0, float(fall - self.curve.c[0] * (self.freezing_point - end)))
