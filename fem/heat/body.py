"""A meshed piece with its materials: what every node holds and how heat passes between nodes."""

from __future__ import annotations

import copy
from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import scipy.sparse as sp
from scipy.spatial import cKDTree

from fem.curve import Array, State
from fem.heat import forms
from fem.heat.linear import Factor, factor_for
from fem.heat.part import Part, place
from fem.heat.pattern import Pattern
from fem.material import Material
from fem.mesh.domain import Domain


class Body:
    """The part of the problem that no stage changes.

    The unknown is one enthalpy per node, of the node's host material: product before mould.
    A node on an interface holds two materials, carries the product's enthalpy, and the wall's
    follows from the common temperature.

    Parameters
    ----------
    domain
        Mesh, regions and surfaces.
    materials
        Region -> material; regions of one `Material` object are solved as one part.

    """

    def __init__(self, domain: Domain, materials: Mapping[str, Material]):
        self.domain = domain
        self.materials = dict(materials)
        self.size = domain.points.shape[1]
        self.volumes = {region: forms.volumes(domain, region) for region in domain.regions}
        entries = {region: forms.conductance(domain, region) for region in domain.regions}
        self.pattern = Pattern(
            np.concatenate([rows for rows, _, _ in entries.values()]),
            np.concatenate([columns for _, columns, _ in entries.values()]),
            self.size,
        )
        self.parts = self._parts(entries)
        self.single = len(self.parts) == 1
        self.exposures = {name: forms.exposure(domain, name) for name in domain.surfaces}
        self.edges = {name: domain.edge_areas(name) for name in domain.surfaces}
        self._leader = self._nearest_product()
        self._factor: Factor | None = None

    @property
    def factor(self) -> Factor:
        """The linear solver of the pattern, ordered once."""
        if self._factor is None:
            self._factor = factor_for(self.pattern)
        return self._factor

    def _parts(self, entries: dict) -> list[Part]:
        """Group regions by material; materials that freeze host the nodes they touch."""
        unique = list({id(m): m for m in self.materials.values()}.values())
        only = any(m.freezes for m in unique)
        parts = []
        taken = np.zeros(self.size, dtype=bool)
        for material in sorted(unique, key=lambda m: not m.freezes):
            regions = [region for region, m in self.materials.items() if m is material]
            volume = sum((self.volumes[region] for region in regions), np.zeros(self.size))
            data = sum((self.pattern.gather(*entries[r]) for r in regions), np.zeros(len(self.pattern.rows)))
            nodes = np.flatnonzero(volume > 0)
            shared = taken[nodes]
            taken[nodes] = True
            held = np.zeros(self.size, dtype=bool)
            held[nodes] = True
            filled = np.flatnonzero(held[self.pattern.rows] & held[self.pattern.columns])
            rows, columns = (
                np.searchsorted(nodes, x[filled]) for x in (self.pattern.rows, self.pattern.columns)
            )
            parts.append(
                Part(
                    material=material,
                    nodes=place(nodes),
                    volume=volume[nodes],
                    stiffness=sp.csr_matrix((data[filled], (rows, columns)), shape=(len(nodes), len(nodes))),
                    entries=place(filled),
                    data=data[filled],
                    rows=rows,
                    columns=columns,
                    hosted=place(nodes[~shared]),
                    hosted_at=place(np.flatnonzero(~shared)),
                    guest=place(nodes[shared]),
                    guest_at=place(np.flatnonzero(shared)),
                    guests=int(shared.sum()),
                    leads=not shared.any() and material.freezes == only,
                )
            )
        return parts

    def _nearest_product(self) -> np.ndarray:
        """For each node, the one whose conductivity scales its unknown (see `HeatProblem`)."""
        leader = np.arange(self.size)
        every = np.arange(self.size)
        frozen = [every[part.hosted] for part in self.parts if part.material.freezes]
        others = [every[part.hosted] for part in self.parts if not part.material.freezes]
        if frozen and others:
            product, rest = np.concatenate(frozen), np.concatenate(others)
            _, near = cKDTree(self.domain.points[:, product].T).query(self.domain.points[:, rest].T)
            leader[rest] = product[near]
        return leader

    def with_materials(self, materials: Mapping[str, Material]) -> Body:
        """Return the same meshed piece of other materials; nothing is assembled again.

        Regions that shared a material have to share one still.
        """
        other = copy.copy(self)
        other.materials = dict(materials)
        regions = {id(m): region for region, m in self.materials.items()}
        other.parts = [replace(p, material=materials[regions[id(p.material)]]) for p in self.parts]
        return other

    def state(self, u: Array) -> State:
        """Return each node's temperature, and its host's Kirchhoff integral, capacity, conductivity."""
        if self.single:
            return self.parts[0].curve.at(u)
        out = State(*(np.empty(self.size) for _ in range(4)))
        for part in self.parts:
            for whole, values in zip(out, part.curve.at(u[part.hosted]), strict=True):
                whole[part.hosted] = values
        return out

    def temperature(self, u: Array) -> Array:
        """Return the temperature of each node [degC]."""
        return self.state(u).temperature

    def enthalpy_at(self, T: Array, nodes: np.ndarray) -> Array:
        """Return the host's enthalpy [J/m3] of some nodes at temperatures [degC]."""
        out = np.empty(self.size)
        out[nodes] = T
        for part in self.parts:
            mine = np.zeros(self.size, dtype=bool)
            mine[part.hosted] = True
            mine &= np.isin(np.arange(self.size), nodes)
            out[mine] = part.curve.enthalpy(out[mine])
        return out[nodes]

    def stored(self, u: Array, state: State) -> tuple[Array, Array]:
        """Return the heat each node holds [J] and its derivative to the node's temperature [J/K]."""
        if self.single:
            volume = self.parts[0].volume
            return volume * u, volume * state.capacity
        held, slope = np.zeros(self.size), np.zeros(self.size)
        for part in self.parts:
            held[part.nodes] += part.volume * part.enthalpy(u, state.temperature)
            slope[part.nodes] += part.volume * part.capacity(state)
        return held, slope

    def conduction(self, state: State) -> Array:
        """Return the heat that reaches each node from its neighbours [W].

        Each part drives its own Kirchhoff integral through its own constant stiffness, so no
        conductivity is ever averaged over a cell that the front crosses.
        """
        if self.single:
            return np.asarray(-(self.parts[0].stiffness @ state.kirchhoff))
        flow = np.zeros(self.size)
        for part in self.parts:
            flow[part.nodes] -= part.stiffness @ part.kirchhoff(state)
        return flow

    def conduction_change(self, state: State, dT: Array) -> Array:
        """Return the change of `conduction` [W] for changes of temperature [K], shape (n, m)."""
        flow = np.zeros_like(dT)
        for part in self.parts:
            flow[part.nodes] -= part.stiffness @ (part.conductivity(state)[:, None] * dT[part.nodes])
        return flow

    def scale(self, state: State) -> Array:
        """Return the conductivity that scales each node's unknown: its own, or the nearest product's."""
        return state.conductivity if self.single else state.conductivity[self._leader]

    def stiffness(self, state: State, scale: Array) -> Array:
        """Return the Jacobian of conduction for the scaled unknown, along the pattern [m].

        Exact and constant within a part; between parts the geometric mean of both ends keeps it
        symmetric, and takes as few iterations as the unsymmetric exact one.
        """
        if self.single:
            return self.parts[0].data
        data = np.zeros(len(self.pattern.rows))
        for part in self.parts:
            if part.leads:
                data[part.entries] += part.data
            else:
                root = np.sqrt(part.conductivity(state) / scale[part.nodes])
                data[part.entries] += part.data * root[part.rows] * root[part.columns]
        return data

    def heat(self, u: Array) -> dict[str, float]:
        """Return the heat held by each region of the whole piece [J]."""
        T = self.temperature(u)
        out = {}
        for region, material in self.materials.items():
            part = next(p for p in self.parts if p.material is material)
            out[region] = float(self.volumes[region][part.nodes] @ part.enthalpy(u, T))
        return out

    def masses(self) -> dict[str, float]:
        """Return the mass of each region of the whole piece [kg]."""
        return {r: float(self.volumes[r].sum()) * m.density for r, m in self.materials.items()}
