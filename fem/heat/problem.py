"""The heat problem of one stage, in the handful of terms that the march asks for."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np

from fem.curve import Array, State
from fem.heat.body import Body
from fem.heat.exchange import Exchange, Fixed

# Without it a front of water takes half the factorisations; none at all, and the time at which
# its last drop freezes is 0.2 % off.
AT_A_JUMP = 0.1


@dataclass(frozen=True, eq=False)
class Look:
    """A state looked at: all that follows from the enthalpies at one moment.

    Parameters
    ----------
    stored
        Heat each node holds [J].
    rate
        Heat that reaches each node [W]; at nodes of fixed temperature what conduction brings.
    passed
        Heat that leaves through each surface [W], in the order of `HeatProblem.surfaces`; for a
        fixed surface what conduction brings to its nodes.
    state
        Temperature and the host's properties at each node.
    slope
        Derivative of `stored` to temperature [J/K].
    exchange_slope
        Derivative of what leaves to temperature, at each node [W/K].

    """

    u: Array
    stored: Array
    rate: Array
    passed: Array
    state: State
    slope: Array
    exchange_slope: Array

    @property
    def stored_slope(self) -> Array:
        """Derivative of what a node holds to its unknown, the host's enthalpy [m3]."""
        return self.slope / self.state.capacity


class HeatProblem:
    """Conduction in a body whose surfaces exchange heat.

    Parameters
    ----------
    body
        Mesh and materials.
    exchanges
        Surface -> exchange; surfaces that are not named are insulated.
    began
        When the stage began [s]; the exchanges' clocks start there.
    span
        Lowest and highest temperature that the run will see [degC]: what errors are measured by.

    """

    def __init__(
        self, body: Body, exchanges: Mapping[str, Exchange], began: float, span: tuple[float, float]
    ):
        self.body = body
        self.began = began
        self.exchanges = dict(exchanges)
        self.surfaces = tuple(self.exchanges)
        self._exposed = {}
        self._fixed: dict[str, np.ndarray] = {}
        held = np.zeros(body.size, dtype=bool)
        for name, exchange in self.exchanges.items():
            area = body.exposures[name]
            nodes = np.flatnonzero(area > 0)
            if isinstance(exchange, Fixed):
                self._fixed[name] = nodes[~held[nodes]]
                held[nodes] = True
            else:
                self._exposed[name] = (nodes, area[nodes], body.edges[name][nodes])
        self.held = np.flatnonzero(held)
        self.free = ~held
        pattern = body.pattern
        self._open = (~held[pattern.rows] & ~held[pattern.columns]).astype(float) if held.any() else None
        self._reach = self._stored_span(span)
        self._kelvins = max(span[1] - span[0], 1e-3)
        self._jump = self._jumps()

    def _stored_span(self, span: tuple[float, float]) -> Array:
        """Heat that each node gives up over the span of temperatures [J]."""
        low, high = span[0], max(span[1], span[0] + 1e-3)
        reach = np.zeros(self.body.size)
        for part in self.body.parts:
            H = part.curve.enthalpy(np.array([low, high]))
            reach[part.nodes] += part.volume * (H[1] - H[0])
        return reach

    def _jumps(self) -> tuple[Array, Array]:
        """Enthalpies between which each node's host gives up heat at one temperature [J/m3].

        The first above the second where there is no such heat.
        """
        low, high = np.full(self.body.size, np.inf), np.full(self.body.size, -np.inf)
        for part in self.body.parts:
            curve = part.curve
            found = [i for i in range(1, len(curve.T)) if curve.jumps(i)]
            if found:
                most = max(found, key=lambda i: float(curve.H[i] - curve.H[i - 1]))
                low[part.hosted], high[part.hosted] = curve.H[most - 1], curve.H[most]
        return low, high

    # What the march asks for.

    def impose(self, time: float, u: Array) -> Array:
        """Return `u` with the nodes of fixed temperature set to what holds at `time` [s]."""
        if not self._fixed:
            return u
        u = u.copy()
        for name, nodes in self._fixed.items():
            exchange = self.exchanges[name]
            assert isinstance(exchange, Fixed)
            T = np.full(len(nodes), exchange.surface_temperature(time - self.began))
            u[nodes] = self.body.enthalpy_at(T, nodes)
        return u

    def look(self, time: float, u: Array) -> Look:
        """Return what follows from the host enthalpies `u` [J/m3] at `time` [s]."""
        state = self.body.state(u)
        stored, slope = self.body.stored(u, state)
        rate = self.body.conduction(state)
        exchange_slope = np.zeros(self.body.size)
        passed = np.zeros(len(self.surfaces))
        for i, name in enumerate(self.surfaces):
            if name not in self._exposed:
                continue
            nodes, area, edge_area = self._exposed[name]
            flux, flux_slope = self.exchanges[name].flux(state.temperature[nodes], time - self.began)
            rate[nodes] -= area * flux
            passed[i] = edge_area @ flux
            exchange_slope[nodes] += area * flux_slope
        for i, name in enumerate(self.surfaces):
            if name in self._fixed:
                passed[i] = rate[self._fixed[name]].sum()
        return Look(u, stored, rate, passed, state, slope, exchange_slope)

    def correct(self, look: Look, g: float, residual: Array) -> Array:
        """Return the Newton correction of `u` for ``stored - g rate = ...`` with its residual [J].

        The matrix is solved for the Kirchhoff integral, the enthalpy is what is updated: across
        the latent heat dH/dT changes several hundred-fold, and an update of T hops over it.
        """
        body = self.body
        scale = body.scale(look.state)
        v = body.factor.solve(self._matrix(look, g, scale), -np.where(self.free, residual, 0.0))
        return np.asarray(look.state.capacity / scale * v)

    def _matrix(self, look: Look, g: float, scale: Array) -> Array:
        """Return the matrix of a step along the pattern; rows of imposed nodes are those of 1."""
        pattern = self.body.pattern
        data = g * self.body.stiffness(look.state, scale)
        diagonal = (look.slope + g * look.exchange_slope) / scale
        if self._open is not None:
            data *= self._open
            diagonal = np.where(self.free, diagonal, 1.0)
        data[pattern.diagonal] += diagonal
        return data

    # What sensitivities ask for besides.

    def leaving(self, time: float, T: Array) -> Array:
        """Return the heat that leaves each node by exchange [W] at nodal temperatures [degC]."""
        out = np.zeros(self.body.size)
        for name, (nodes, area, _) in self._exposed.items():
            out[nodes] += area * self.exchanges[name].flux(T[nodes], time - self.began)[0]
        return out

    def balance(self, time: float, u: Array, state: State | None = None) -> tuple[Array, Array]:
        """Return what each node holds [J] and what reaches it [W], and nothing else of a `look`.

        `state` may be handed in where it is known already.
        """
        state = self.body.state(u) if state is None else state
        held = self.body.stored(u, state)[0]
        return held, self.body.conduction(state) - self.leaving(time, state.temperature)

    def jacobian(self, look: Look, g: float, du: Array) -> Array:
        """Return the exact change of ``stored - g rate`` [J] for changes of `u`, shape (n, m)."""
        dT = du / look.state.capacity[:, None]
        passed = look.exchange_slope[:, None] * dT
        return look.slope[:, None] * dT + g * (passed - self.body.conduction_change(look.state, dT))

    def factored(self, look: Look, g: float) -> Callable[[Array], Array]:
        """Factorise the matrix of a step and return what solves with it, several sides at once."""
        factor = self.body.factor
        scale = self.body.scale(look.state)
        first = np.zeros(self.body.size)
        factor.solve(self._matrix(look, g, scale), first)
        return factor.again

    def settle(self, stored: Array, look: Look) -> Array:
        """Return the `u` at which each node holds exactly `stored` [J], near a look.

        One division where a node holds one material; on interfaces a few scalar iterations.
        """
        u = look.u + np.where(self.free, (stored - look.stored) / look.stored_slope, 0.0)
        if self.body.single:
            return u
        for part in self.body.parts:
            if not part.guests:
                continue
            for _ in range(20):
                state = self.body.state(u)
                held, slope = self.body.stored(u, state)
                gap = np.where(self.free, stored - held, 0.0)[part.guest]
                u[part.guest] += gap * (state.capacity / slope)[part.guest]
                if np.all(np.abs(gap) <= 1e-14 * self._reach[part.guest]):
                    break
        return u

    def mean_size(self, energy: Array) -> float:
        """Return the root mean square of an energy error, as a share of what each node gives up."""
        share = np.where(self.free, energy / self._reach, 0.0)
        return float(np.sqrt((self._reach @ (share * share)) / self._reach.sum()))

    def worst_size(self, energy: Array, look: Look) -> float:
        """Return the largest energy error of a node as a temperature, as a share of the run's span."""
        return float(np.max(np.abs(np.where(self.free, energy / look.slope, 0.0)))) / self._kelvins

    def fastest(self, rate: Array) -> float:
        """Return the largest share of what a node gives up that it gives up per second [1/s]."""
        return float(np.max(np.abs(np.where(self.free, rate / self._reach, 0.0))))

    def smooth_size(self, energy: Array, before: Look, after: Look) -> float:
        """Return the root mean square of an error as temperature, as a share of the run's span.

        Nodes whose capacity changes by half or more in the step cross latent heat: there the
        energy says how good the step is, and a temperature says nothing. Where latent heat
        leaves at one temperature it says little anywhere: node after node is held at that
        temperature and let go, and all behind the front go down in stairs, which are the mesh's
        and not the step's. It then counts `AT_A_JUMP` of itself.
        """
        low, high = self._jump
        on_the_way = (np.minimum(before.u, after.u) < high) & (np.maximum(before.u, after.u) > low)
        weight = AT_A_JUMP if np.any(on_the_way & self.free) else 1.0
        ratio = after.state.capacity / before.state.capacity
        smooth = self.free & (ratio > 0.67) & (ratio < 1.5)
        if not smooth.any():
            return 0.0
        T = energy[smooth] / (after.slope[smooth] * self._kelvins)
        reach = self._reach[smooth]
        return weight * float(np.sqrt((reach @ (T * T)) / self._reach.sum()))

    def held_heat(self, stored: Array) -> Array:
        """Return the heat held by the nodes of each fixed surface [J], 0 for other surfaces."""
        out = np.zeros(len(self.surfaces))
        for i, name in enumerate(self.surfaces):
            if name in self._fixed:
                out[i] = stored[self._fixed[name]].sum()
        return out
