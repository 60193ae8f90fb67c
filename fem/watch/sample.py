"""Values at places of the piece that are not nodes."""

from __future__ import annotations

from contextlib import suppress

import numpy as np
import scipy.sparse as sp

from fem.mesh.domain import Array, Domain


class Outside(ValueError):
    """A place does not lie in the piece.

    Parameters
    ----------
    which
        Indices of the places that do not.

    """

    def __init__(self, which: np.ndarray):
        self.which = which
        super().__init__(f"{len(which)} places lie outside the piece")


def locate(domain: Domain, points: Array) -> tuple[np.ndarray, Array]:
    """Return the cell that each place lies in, and the place as found.

    Places are mirrored into the solved part; one on the outline, which rounding may put just
    outside, is moved inwards by a millionth of the piece.

    Parameters
    ----------
    domain
        Where to look.
    points
        Coordinates in the whole piece [m], shape (2, n).

    Raises
    ------
    Outside
        With the places that lie in no cell.

    """
    places = domain.fold(np.asarray(points, dtype=float))
    finder = domain.mesh.element_finder()
    centre = domain.points.mean(axis=1, keepdims=True)
    # All at once is many times as fast, but where one is in no cell scikit-fem looks through every cell
    # and then says so of all: they are looked for off the outline, by less than any mesh can tell.
    moved = places + 1e-9 * (centre - places)
    with suppress(ValueError):
        return finder(*moved), places
    cells = np.full(places.shape[1], -1)
    for step in (0.0, 1e-9, 1e-6, 1e-4):
        lost = np.flatnonzero(cells < 0)
        moved = places[:, lost] + step * (centre - places[:, lost])
        for i, place in zip(lost, moved.T, strict=True):
            try:
                cells[i] = finder(place[:1], place[1:])[0]
            except ValueError:
                continue  # scikit-fem's word for "in no cell": looked for again further inside
            places[:, i] = place
        if np.all(cells >= 0):
            return cells, places
    raise Outside(np.flatnonzero(cells < 0))


def sampler(domain: Domain, points: Array) -> tuple[sp.csr_matrix, np.ndarray]:
    """Return the matrix from nodal values to values at places, and the cell of each place.

    Parameters
    ----------
    domain
        Mesh to sample.
    points
        Coordinates in the whole piece [m], shape (2, n).

    Returns
    -------
    Matrix of shape (n, nodes) and cells of shape (n,).

    """
    cells, places = locate(domain, points)
    mapping = domain.mesh.mapping()
    local = mapping.invF(places[:, :, None], tind=cells)
    nodes = domain.mesh.t[:, cells]
    element = domain.element
    weights = np.array([element.lbasis(local, i)[0][:, 0] for i in range(nodes.shape[0])])
    rows = np.broadcast_to(np.arange(len(cells)), nodes.shape)
    matrix = sp.csr_matrix(
        (weights.ravel(), (rows.ravel(), nodes.ravel())), shape=(len(cells), domain.mesh.p.shape[1])
    )
    return matrix, cells
