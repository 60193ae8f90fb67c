"""All cells of one material, and what they make of the state of a piece."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from fem.curve import Array, Curve, State
from fem.material import Material

Place = np.ndarray | slice


@dataclass(frozen=True, eq=False)
class Part:
    """All cells of one material.

    Nodes of a mapped mesh come in runs, which are kept as slices: a view costs nothing where an
    index array costs a copy.

    Parameters
    ----------
    material
        Its curve is the only one these cells know, also where they touch another part.
    nodes
        Nodes that hold some of it, n of them.
    volume
        Volume of it that each of those nodes stands for [m3], shape (n,).
    stiffness
        Conductance between those nodes for unit conductivity [m], (n, n).
    entries, data
        Places of its stiffness along the common pattern, and the values there [m].
    rows, columns
        Which of its own nodes each entry joins.
    hosted, hosted_at
        Nodes whose enthalpy is this material's own, in the piece and among its own nodes.
    guest, guest_at
        Nodes that hold some of it, but whose enthalpy is another's; the temperature is shared.
    leads
        Whether the unknown of all its nodes is scaled by its own conductivity.

    """

    material: Material
    nodes: Place
    volume: Array
    stiffness: sp.csr_matrix
    entries: Place
    data: Array
    rows: np.ndarray
    columns: np.ndarray
    hosted: Place
    hosted_at: Place
    guest: Place
    guest_at: Place
    guests: int
    leads: bool

    @property
    def curve(self) -> Curve:
        """The enthalpy, temperature and conductivity of the material."""
        return self.material.curve

    def fill(self, own: Array, shared: Array | None) -> Array:
        """Return a value at each of its nodes: from its hosts' values, and those at shared nodes."""
        if not self.guests:
            return np.array(own[self.hosted])
        out = np.empty(len(self.volume))
        out[self.hosted_at] = own[self.hosted]
        out[self.guest_at] = shared
        return out

    def enthalpy(self, u: Array, T: Array) -> Array:
        """Return H at its nodes [J/m3]."""
        return self.fill(u, self.curve.enthalpy(T[self.guest]) if self.guests else None)

    def capacity(self, state: State) -> Array:
        """Return dH/dT at its nodes [J/m3/K]."""
        shared = self.curve.capacity(state.temperature[self.guest]) if self.guests else None
        return self.fill(state.capacity, shared)

    def kirchhoff(self, state: State) -> Array:
        """Return the Kirchhoff integral at its nodes [W/m]."""
        shared = self.curve.kirchhoff(state.temperature[self.guest]) if self.guests else None
        return self.fill(state.kirchhoff, shared)

    def conductivity(self, state: State) -> Array:
        """Return the conductivity at its nodes [W/m/K]."""
        shared = self.curve.conductivity(state.temperature[self.guest]) if self.guests else None
        return self.fill(state.conductivity, shared)


def place(indices: np.ndarray) -> Place:
    """Return rising indices as a slice where they are a run without gaps."""
    if len(indices) and indices[-1] - indices[0] == len(indices) - 1:
        return slice(int(indices[0]), int(indices[-1]) + 1)
    return indices
