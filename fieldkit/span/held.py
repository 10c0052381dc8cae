"""What a support that is set on a standing line comes to hold: filling, heat and pressure.

Linear, every unknown stiffness at its median. A spring meets the pipe's own compliance c at its
station, so that it takes F = movement / (1/k + c).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.factor import Factor
from fieldkit.span.layout import Span, State, axis_vectors
from fieldkit.span.restraint import span_matrices
from fieldkit.span.static import MESH_HZ, ThermalGrowth, solver_of, thermal_growth, weight_load
from fieldkit.span.structure import Structure, assemble, contents_mass
from fieldkit.span.supports import springs

Array = NDArray[np.float64]


@dataclass(frozen=True)
class AddedLoad:
    """What a new support comes to carry once the line is no longer as it was set."""

    filling_n: Array
    """(3,) force on the pipe from the change of contents, x y z."""
    heat_n: Array
    """(3,) force on the pipe from heat and pressure."""


@dataclass(frozen=True)
class Holding:
    """A span going from one state to another, asked what a spring at any station would hold."""

    span: Span
    cold: State
    hot: State
    growth: ThermalGrowth

    def load(self, at_m: float, axis: str, stiffness_n_per_m: float) -> AddedLoad:
        """Load on a spring along ``axis``, set free of force in the first state, in the second."""
        structure = self._structure
        rows = structure.motion_rows(at_m, axis)
        give = np.eye(len(rows)) / stiffness_n_per_m + rows @ self._solver.solve(rows.T)
        vectors = axis_vectors(self.span.centre_line.at(at_m)[1], axis)
        filling = rows @ self._filled
        heat = vectors @ self.growth.at(at_m)
        held = [-np.linalg.solve(give, movement) @ vectors for movement in (filling, heat)]
        return AddedLoad(*held)

    def movement(self, at_m: float, axis: str) -> Array:
        """(k,) free movement by heat and pressure along the unit vectors of ``axis``, metres."""
        vectors = axis_vectors(self.span.centre_line.at(at_m)[1], axis)
        return np.asarray(vectors @ self.growth.at(at_m))

    @cached_property
    def _structure(self) -> Structure:
        return assemble(self.span, self.hot, up_to_hz=MESH_HZ, axial=False)

    @cached_property
    def _solver(self) -> Factor:
        stiffness, mass = span_matrices(self._structure, springs(self.span), self.span.masses)
        return solver_of(stiffness, mass)

    @cached_property
    def _filled(self) -> Array:
        """Movement (6N,) by the change of contents."""
        change = self._structure.fill - self.cold.nominal_fill
        return self._solver.solve(weight_load(change * contents_mass(self._structure)))


def holding(span: Span, cold: State, hot: State) -> Holding:
    """The span with its growth from one state to the other."""
    return Holding(span, cold, hot, thermal_growth(span, cold, hot))
