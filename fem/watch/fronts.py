"""The frozen front along rays: where a level surface lies, and how fast it moves."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.curve import Array, Curve
from fem.heat.body import Body, Part
from fem.material import Material
from fem.watch.product import Product
from fem.watch.sample import Outside, sampler
from fem.watch.schedule import Level, Ray

# Samples to a cell: the nodal field is a chain of straight pieces along a ray, and its kinks
# fall between samples.
SAMPLES = 10
# Latent heat released within this range counts as released at one temperature [K].
JUMP = 0.2


@dataclass(frozen=True, eq=False)
class FrozenShare:
    """How far each place is on the frozen side of a level, from enthalpy, 1 frozen to 0 not.

    At a jump it is the share of the jump's heat that has left, so that a node which is half
    frozen says so; elsewhere a straight function of temperature with 0.5 on the level.

    Parameters
    ----------
    curve
        Of the material.
    low, high
        Enthalpies between which the share runs from 1 to 0 [J/m3]; equal where there is no jump.
    temperature
        The level [degC].

    """

    curve: Curve
    low: float
    high: float
    temperature: float

    @property
    def sharp(self) -> bool:
        """Whether the level is a jump of the enthalpy."""
        return self.high > self.low

    def at(self, H: Array, T: Array) -> Array:
        """Return the share at enthalpies [J/m3] and temperatures [degC], same shapes."""
        if self.sharp:
            return np.clip((self.high - H) / (self.high - self.low), 0.0, 1.0)
        return 0.5 - (T - self.temperature)


def frozen_share(curve: Curve, temperature: float) -> FrozenShare:
    """Return the measure of a level, at a jump of the curve where the level lies in one.

    A jump is an interval of at most `JUMP` around the level that takes more heat than 20 K of
    its surroundings do.
    """
    rows = curve.T
    i = int(np.clip(np.searchsorted(rows, temperature), 1, len(rows) - 1))
    first, last = i - 1, i
    if rows[last] - rows[first] <= JUMP:
        heat = curve.H[last] - curve.H[first]
        around = min(float(curve.capacity(rows[first] - JUMP)), float(curve.capacity(rows[last] + JUMP)))
        if heat > 20.0 * around:
            return FrozenShare(curve, float(curve.H[first]), float(curve.H[last]), temperature)
    return FrozenShare(curve, 0.0, 0.0, temperature)


class Fronts:
    """Positions of the front along the rays of a case.

    Parameters
    ----------
    product
        Where a front can be.
    level
        What the front is.
    rays
        Name -> ray.

    Raises
    ------
    ValueError
        Where a ray does not lie in the piece at all.

    """

    def __init__(self, product: Product, level: Level, rays: dict[str, Ray]):
        self.product = product
        body = product.body
        self._shares = [(part.hosted, share) for part, share in _shares(body, product, level)]
        self._rays = {name: _Track(body, product, ray, name) for name, ray in rays.items()}
        self._last: dict[str, tuple[float, float | None]] = {}

    def see(self, time: float, u: Array, T: Array) -> dict[str, tuple[float | None, float | None]]:
        """Return position [m] and speed [m/s] on each ray; None where there is no front.

        The speed is that since the last row.
        """
        share = np.full(self.product.body.size, np.nan)
        sharp = False
        for nodes, measure in self._shares:
            share[nodes] = measure.at(u[nodes], T[nodes])
            sharp = sharp or measure.sharp
        out: dict[str, tuple[float | None, float | None]] = {}
        for name, track in self._rays.items():
            position = track.position(share, sharp)
            then, before = self._last.get(name, (time, None))
            moving = position is not None and before is not None and time > then
            speed = (position - before) / (time - then) if moving else None  # type: ignore[operator]
            self._last[name] = (time, position)
            out[name] = (position, speed)
        return out


def _shares(body: Body, product: Product, level: Level) -> list[tuple[Part, FrozenShare]]:
    out: list[tuple[Part, FrozenShare]] = []
    materials = {id(body.materials[r]) for r in product.regions}
    for part in body.parts:
        if id(part.material) not in materials:
            continue
        if level.kind == "temperature":
            temperature = level.value
        elif level.kind == "ice":
            temperature = _temperature_of_ice(part.material, level.value)
        else:
            temperature = part.material.freezing_point
        if temperature is not None:
            out.append((part, frozen_share(part.curve, temperature)))
    return out


def _temperature_of_ice(material: Material, ice: float | None) -> float | None:
    """Return where a material holds a share of ice [degC]; None where it never holds so much."""
    if material.ice_rows is None or ice is None or ice > material.freezable:
        return None
    T, shares = material.ice_rows
    return float(np.interp(ice, shares[::-1], T[::-1]))


class _Track:
    """One ray, sampled densely where it runs through product."""

    def __init__(self, body: Body, product: Product, ray: Ray, name: str):
        start, stop = np.array(ray.from_), np.array(ray.to)
        length = float(np.hypot(*(stop - start)))
        cell = min(body.domain.size(r) for r in product.regions)
        count = int(np.clip(np.ceil(SAMPLES * length / cell), 20, 20_000))
        along = np.linspace(0.0, 1.0, count + 1)
        points = start[:, None] + (stop - start)[:, None] * along
        try:
            matrix, cells = sampler(body.domain, points)
        except Outside as outside:
            inside = np.setdiff1d(np.arange(count + 1), outside.which)
            if not len(inside):
                raise ValueError(f'ray "{name}" does not meet the piece') from None
            along = along[inside]
            matrix, cells = sampler(body.domain, points[:, inside])
        in_product = np.isin(cells, np.concatenate([body.domain.regions[r] for r in product.regions]))
        if in_product.sum() < 2:
            raise ValueError(f'ray "{name}" does not run through product')
        self._along = along[in_product] * length
        self._matrix = matrix[np.flatnonzero(in_product)]

    def position(self, share: Array, sharp: bool) -> float | None:
        """Return where frozen turns to unfrozen, or the other way, nearest the first point [m]."""
        known = np.nan_to_num(share, nan=0.0) if np.isnan(share).any() else share
        frozen = self._matrix @ known
        inside = frozen > 0.5
        turns = np.flatnonzero(inside[1:] != inside[:-1])
        if sharp:
            return self._sharp(frozen, turns)
        if not len(turns):
            return None
        i = turns[0]
        a, b = frozen[i] - 0.5, frozen[i + 1] - 0.5
        return float(self._along[i] + (self._along[i + 1] - self._along[i]) * a / (a - b))

    def _sharp(self, frozen: Array, turns: np.ndarray) -> float | None:
        """Return the place from how much of the cells around the turn has frozen.

        The frozen length between the last whole cell and the first untouched one is the integral
        of the share, whichever side the frozen part lies on.
        """
        along = self._along
        if not len(turns):
            # A front that has not reached half of the first cell, or has less than half of the
            # last one to go, is still inside the ray.
            begun = 0.0 < frozen[0] < 1.0 or 0.0 < frozen[-1] < 1.0
            if not begun:
                return None
            turn = 0 if 0.0 < frozen[0] < 1.0 else len(frozen) - 2
        else:
            turn = int(turns[0])
        rising = frozen[-1] > frozen[0] if not len(turns) else frozen[turn + 1] > frozen[turn]
        share = 1.0 - frozen if rising else frozen
        whole = np.flatnonzero(share[: turn + 1] >= 1.0 - 1e-9)
        first = int(whole[-1]) if len(whole) else 0
        untouched = np.flatnonzero(share[turn + 1 :] <= 1e-9)
        last = turn + 1 + int(untouched[0]) if len(untouched) else len(share) - 1
        return float(along[first] + np.trapezoid(share[first : last + 1], along[first : last + 1]))
