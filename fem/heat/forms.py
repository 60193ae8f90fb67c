"""The weak forms: what a node holds, what passes between nodes, what a surface exposes.

All integrals are over the whole piece; `Domain.weight` is the only place where radius, length
and mirror images enter.
"""

from __future__ import annotations

import numpy as np
import skfem
from skfem.helpers import dot, grad

from fem.mesh.domain import Array, Domain


def volumes(domain: Domain, region: str) -> Array:
    """Return the volume of a region that each node stands for [m3], shape (nodes,).

    The row sums of the mass matrix. Lumping keeps every node's enthalpy its own, which is what
    lets latent heat be counted exactly; consistent mass costs more than twice the iterations.
    """
    basis = skfem.Basis(domain.mesh, domain.element, elements=domain.regions[region])

    @skfem.LinearForm
    def content(v, w):  # type: ignore[no-untyped-def]
        return domain.weight(w.x) * v

    return np.asarray(content.assemble(basis))


def conductance(domain: Domain, region: str) -> tuple[np.ndarray, np.ndarray, Array]:
    """Return the stiffness of a region for unit conductivity as (rows, columns, values [m]).

    In coordinates and not as a matrix: exact zeros stay, so that every region of every case
    fits into one pattern.
    """
    basis = skfem.Basis(domain.mesh, domain.element, elements=domain.regions[region])

    @skfem.BilinearForm
    def conduction(u, v, w):  # type: ignore[no-untyped-def]
        return domain.weight(w.x) * dot(grad(u), grad(v))

    coo = conduction.coo_data(basis)
    return coo.indices[0], coo.indices[1], np.asarray(coo.data)


def exposure(domain: Domain, surface: str) -> Array:
    """Return the area of a surface that each node stands for [m2], shape (nodes,)."""
    basis = skfem.FacetBasis(domain.mesh, domain.element, facets=domain.surfaces[surface])

    @skfem.LinearForm
    def area(v, w):  # type: ignore[no-untyped-def]
        return domain.weight(w.x) * v

    # Rounding leaves traces at nodes of the same cells that are not on the surface.
    on = np.zeros(domain.mesh.nvertices, dtype=bool)
    on[domain.mesh.facets[:, domain.surfaces[surface]]] = True
    return np.where(on, area.assemble(basis), 0.0)
