"""Total freezing time in the limit of small Stefan number: one Poisson solve on the mesh of the run.

While the front moves slowly each surface sees a steady temperature. Summed up over time, the
temperature below the freezing point then obeys one linear equation for the whole piece, however
the front went: ``w = integral of (T_f - T) dt`` has ``div(k grad w) = L`` where it is frozen and 0
in a mould wall, and is 0 at the point that freezes last, nowhere less. So with

- ``phi``: ``-div(k grad phi) = 1`` in the product and 0 in walls, ``k dphi/dn + h phi = 0``,
- ``E``: the temperature that the piece comes to, ``div(k grad E) = 0``, ``k dE/dn + h (E - T_c) = 0``,

all latent heat ``L`` is gone after ``L max(phi / (T_f - E))``. With one coolant for every surface
``E`` is that coolant, and ``phi`` alone has to be solved for. Exact for any shape, with coefficients
that vary over the surface and walls of any conductivity, for a liquid at its freezing point.

References
----------
Transform of Baiocchi and Duvaut (value from memory; the derivation above was re-checked).

"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from fem.curve import Array
from fem.heat.body import Body
from fem.heat.exchange import Exchange, Fixed, Flux, Insulated

# Coolants that differ by less than this are one [K].
SAME = 1e-6
# Clocks over which a signal is averaged.
CLOCKS = 101


class NeverFreezes(ValueError):
    """Says why a body has no total freezing time."""


@dataclass(frozen=True)
class Film:
    """What one surface meets, steady.

    Parameters
    ----------
    h
        Heat transfer coefficient [W/m2/K]; infinite for a surface held at a temperature, 0 for a
        given flux.
    coolant
        What the surface is driven to [degC]; 0 for a given flux.
    flux
        Given flux that leaves the product [W/m2]; else 0.
    steady
        Whether nothing was averaged over time.

    """

    h: float
    coolant: float
    flux: float = 0.0
    steady: bool = True

    @classmethod
    def of(cls, exchange: Exchange, lasts: float) -> Film | None:
        """Return the mean of an exchange over a stage that lasts so long [s]; None where insulated.

        Radiation counts with its slope at the temperature of the surroundings.
        """
        if isinstance(exchange, Insulated):
            return None
        steady = not len(exchange.knots())
        clocks = np.zeros(1) if steady else np.linspace(0.0, lasts, CLOCKS)
        if isinstance(exchange, Flux):
            return cls(0.0, 0.0, float(np.mean([exchange.flux_out.at(float(c)) for c in clocks])), steady)
        around = [exchange.environment(float(c)) for c in clocks]
        through = [np.inf if isinstance(exchange, Fixed) else exchange.coefficient(float(c)) for c in clocks]
        h, coolant = (float(np.mean(np.array(values, dtype=float))) for values in (through, around))
        return cls(h, coolant, 0.0, steady)


@dataclass(frozen=True, eq=False)
class QuasiSteady:
    """The potential of a body between films, at the point that freezes last.

    Parameters
    ----------
    phi
        Largest potential for a source of 1 in the product, in the sense of the time [m3 K/W].
    coolant
        Temperature that this point comes to in the end [degC]; the coolant where all are the same.
    node
        The point that freezes last.

    """

    phi: float
    coolant: float
    node: int

    def time(self, heat: float, temperature: float) -> float:
        """Return how long it takes to give up `heat` [J/m3] at a temperature [degC]; in s."""
        return heat * self.phi / (temperature - self.coolant)

    @classmethod
    def of(
        cls,
        body: Body,
        films: Mapping[str, Film],
        conductivity: Mapping[str, float],
        freezing_point: float,
    ) -> QuasiSteady:
        """Solve for a body.

        Parameters
        ----------
        body
            Mesh and materials.
        films
            Surface -> what it meets; surfaces that are not named are insulated.
        conductivity
            Region -> conductivity, of the product when frozen [W/m/K].
        freezing_point
            [degC].

        Raises
        ------
        NeverFreezes
            Where nothing carries heat off to a known temperature, or part of the product would
            never freeze.

        """
        if not any(film.h > 0 for film in films.values()):
            raise NeverFreezes("no surface carries heat off to a known temperature")
        data, held = _matrix(body, films, conductivity)
        source = np.zeros(body.size)
        for region in body.domain.product:
            source += body.volumes[region]
        phi = body.factor.solve(data, np.where(held, 0.0, source))
        nodes = np.flatnonzero(source > 0)
        end = _comes_to(body, films, data, held, conductivity)[nodes]
        drive = freezing_point - end
        if drive.min() <= 0.0:
            warmest = f"part of the product comes to {end.max():.3g} degC"
            raise NeverFreezes(f"{warmest} and never freezes (freezing point {freezing_point:.3g} degC)")
        last = int(np.argmax(phi[nodes] / drive))
        return cls(float(phi[nodes[last]]), float(end[last]), int(nodes[last]))


def _matrix(
    body: Body, films: Mapping[str, Film], conductivity: Mapping[str, float]
) -> tuple[Array, np.ndarray]:
    """Return the matrix along the pattern [W/K], and which nodes are held at a temperature."""
    data = np.zeros(len(body.pattern.rows))
    for part in body.parts:
        # Regions of one material are one part.
        region = next(r for r, material in body.materials.items() if material is part.material)
        data[part.entries] += conductivity[region] * part.data
    held = np.zeros(body.size, dtype=bool)
    for name, film in films.items():
        area = body.exposures[name]
        if np.isinf(film.h):
            held |= area > 0
        else:
            data[body.pattern.diagonal] += film.h * area
    if held.any():
        data *= ~held[body.pattern.rows] & ~held[body.pattern.columns]
        data[body.pattern.diagonal[held]] = 1.0
    return data, held


def _comes_to(
    body: Body, films: Mapping[str, Film], data: Array, held: np.ndarray, conductivity: Mapping[str, float]
) -> Array:
    """Return the temperature that each node comes to [degC]."""
    coolants = [film.coolant for film in films.values() if film.h > 0]
    if max(coolants) - min(coolants) < SAME and not any(film.flux for film in films.values()):
        return np.full(body.size, float(np.mean(coolants)))
    load, value = np.zeros(body.size), np.zeros(body.size)
    known = np.zeros(body.size, dtype=bool)
    for name, film in films.items():
        area = body.exposures[name]
        if np.isinf(film.h):
            mine = (area > 0) & ~known
            value[mine], known[mine] = film.coolant, True
        else:
            load += area * (film.h * film.coolant - film.flux)
    if held.any():
        free = {name: film for name, film in films.items() if not np.isinf(film.h)}
        whole, _ = _matrix(body, free, conductivity)
        load -= body.pattern.matrix(whole) @ value
    return body.factor.solve(data, np.where(held, value, load))
