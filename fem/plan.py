"""A case made ready to run: the meshed body, its start, and what the march must know."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from fem.case.case import Case, Stage
from fem.curve import Array
from fem.errors import CaseError, Problem
from fem.heat.body import Body
from fem.heat.exchange import Insulated
from fem.march.control import Control
from fem.mesh.build import build
from fem.result.fields import check_format
from fem.watch.record import Record

# A logged signal has a row every few seconds: landing on each would cost more than it is worth.
MOST_KNOTS = 50
# Mass of one piece [kg], far beyond what is moulded (25 to 150 mL; common practice, no source): a
# drawing in inches read as millimetres ends outside.
USUAL_MASS = (5e-3, 1.0)


@dataclass(frozen=True, eq=False)
class Plan:
    """A case and the body that it is solved on.

    Parameters
    ----------
    case
        As read.
    body
        Meshed, with its materials.

    """

    case: Case
    body: Body

    @classmethod
    def of(cls, case: Case) -> Plan:
        """Mesh the shape and build the materials of a case."""
        built = {name: material.build() for name, material in case.materials.items()}
        domain = build(case.shape, case.piece.length)
        materials = {region: built[case.regions[region]] for region in domain.regions}
        if "product" not in materials:
            # A mesh may call its regions anything: product is then what can freeze.
            frozen = tuple(region for region, material in materials.items() if material.freezes)
            domain = replace(domain, product=frozen or tuple(materials))
        return cls(case, Body(domain, materials))

    @cached_property
    def surfaces(self) -> tuple[str, ...]:
        """Surfaces that exchange heat in any stage, in the order of the shape."""
        used = {
            name
            for stage in self.case.stages
            for name, exchange in stage.surfaces.items()
            if not isinstance(exchange, Insulated)
        }
        return tuple(name for name in self.body.domain.surfaces if name in used)

    def record(self) -> Record:
        """Return the observers that the case asks for.

        Raises
        ------
        CaseError
            Where a watched place lies outside the piece, or fields cannot be written as asked.

        """
        try:
            check_format(self.case.watch.fields)
            return Record(self.body, self.case.watch, self.surfaces, self.cooling)
        except ValueError as error:
            raise CaseError(self.case.source, [Problem("watch", str(error))]) from error

    @cached_property
    def start(self) -> Array:
        """Enthalpy of each node's host at the start [J/m3]; a shared node starts as the product."""
        u = np.empty(self.body.size)
        for region in reversed(list(self.body.domain.regions)):
            material = self.body.materials[region]
            part = next(p for p in self.body.parts if p.material is material)
            here = np.zeros(self.body.size, dtype=bool)
            here[part.hosted] = True
            here &= self.body.volumes[region] > 0
            u[here] = material.start_enthalpy(self.case.piece.start_of(region))
        return u

    @cached_property
    def start_temperature(self) -> float:
        """Start temperature of the product, the mean of its regions [degC]."""
        return float(np.mean([self.case.piece.start_of(r) for r in self.body.domain.product]))

    @cached_property
    def cooling(self) -> bool:
        """Whether the run means to cool: by its aim, a stage's end, or what surrounds it."""
        if self.case.aim is not None:
            return self.case.aim.reach <= self.start_temperature
        for stage in self.case.stages:
            if stage.until is not None:
                return stage.until.below
        around = self._environments(self.case.stages[0])
        return not around or float(np.mean(around)) <= self.start_temperature

    @cached_property
    def span(self) -> tuple[float, float]:
        """Lowest and highest temperature that the run can see [degC]; errors are measured by it."""
        seen = [self.case.piece.start_of(r) for r in self.body.domain.regions]
        for stage in self.case.stages:
            seen += self._environments(stage)
            if any(exchange.environment(0.0) is None for exchange in stage.surfaces.values()):
                # A given flux bounds nothing; the trade's coldest and warmest baths do.
                seen += [self.start_temperature - 20.0, self.start_temperature + 1.0]
        if self.case.aim is not None:
            seen.append(self.case.aim.reach)
        low, high = min(seen), max(seen)
        return low, max(high, low + 1.0)

    @staticmethod
    def _environments(stage: Stage) -> list[float]:
        found = []
        for exchange in stage.surfaces.values():
            clocks = [0.0, stage.lasts, *exchange.knots()]
            found += [T for c in clocks if (T := exchange.environment(float(c))) is not None]
        return found

    def no_accounts(self, stage: Stage) -> Array:
        """Return empty accounts for the surfaces of a stage [J]."""
        return np.zeros(len(stage.surfaces))

    def landings(self, stage: Stage, began: float) -> list[float]:
        """Return the times at which steps have to end: field frames and kinks of signals [s]."""
        every = self.case.watch.frames
        first = int(np.floor(began / every)) + 1
        last = int(np.ceil((began + stage.lasts) / every))
        return [n * every for n in range(first, last)] + [began + c for c in self._knots(stage) if c > 0.0]

    def control(self, stage: Stage) -> Control:
        """Return the tolerances for a stage; steps do not stride over a signal logged in detail."""
        control = self.case.stepping.control()
        logged = [e.knots() for e in stage.surfaces.values() if len(e.knots()) > MOST_KNOTS]
        if logged:
            stride = 5.0 * min(float(np.median(np.diff(knots))) for knots in logged)
            control = replace(control, largest_step=min(control.largest_step or np.inf, stride))
        return control

    @staticmethod
    def _knots(stage: Stage) -> list[float]:
        return [float(c) for e in stage.surfaces.values() if len(e.knots()) <= MOST_KNOTS for c in e.knots()]

    def place_of(self, node: int | None) -> str:
        """Say where a node is, and on which surface; empty where no node is to blame."""
        if node is None:
            return ""
        x, y = self.body.domain.points[:, node] * 1e3
        on = [name for name, area in self.body.exposures.items() if area[node] > 0]
        return f"near ({x:.3g}, {y:.3g}) mm" + (f" on surface {', '.join(on)}" if on else "")

    def cautions(self) -> list[str]:
        """Return sentences that a reader of the result has to know, none of them an error."""
        said = []
        for stage in self.case.stages:
            for surface, exchange in stage.surfaces.items():
                said += [f"stage {stage.name}, surface {surface}: {text}" for text in exchange.cautions()]
        for region, material in self.body.materials.items():
            said += [f"{region}: {text}" for text in material.cautions]
            low, high = material.range
            if self.span[0] < low or self.span[1] > high:
                said.append(
                    f"{region}: the run goes from {self.span[0]:.4g} to {self.span[1]:.4g} degC, "
                    f"the properties hold from {low:.4g} to {high:.4g} degC"
                )
        masses = self.body.masses()
        mass = sum(masses[region] for region in self.body.domain.product)
        if self.case.aim is not None and not USUAL_MASS[0] <= mass <= USUAL_MASS[1]:
            said.append(f"one piece holds {1e3 * mass:.3g} g: see whether the drawing's unit was read right")
        if self.case.shape.form == "bar":
            said.append(
                "the section across the bar leaves out its ends: true at mid-height and below the coolant's "
                "level; mix above that level freezes later"
            )
        return said
