"""What the practice rig shakes: the modes of a span, and a machine that runs beside it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.span.layout import Span, State, axis_vectors
from fieldkit.span.modes import solve, span_matrices
from fieldkit.span.structure import assemble
from fieldkit.span.supports import springs

Real = NDArray[np.float64]

_LEAST_DAMPING, _MOST_DAMPING = 0.006, 0.018
_LEAST_GAIN = 1e-6


@dataclass(frozen=True)
class PracticeMachine:
    """A machine with forces at multiples of its speed."""

    name: str
    speed_rpm: float
    newton: tuple[tuple[float, float], ...]
    """(order, amplitude of the force)."""
    at_m: float
    along: tuple[float, float, float] = (0.1, 0.5, 0.85)
    """Unit vector of its force."""


@dataclass(frozen=True, eq=False)
class PracticePlant:
    """Modes of unit modal mass, and where they move."""

    name: str
    frequency_hz: Real
    """(m,) undamped natural frequencies: what a tap test should find."""
    damping_ratio: Real
    """(m,)"""
    station_m: Real
    """(n,)"""
    tangent: Real
    """(n, 3) unit vectors along the pipe."""
    shape: Real
    """(m, n, 3) displacement, 1/sqrt(kg)."""
    machine: PracticeMachine | None = None

    def along(self, at_m: float, vector: Sequence[float] | Real) -> Real:
        """(m,) motion of each mode at a station along a vector (3,)."""
        shape = np.stack(
            [
                [np.interp(at_m, self.station_m, mode[:, axis]) for axis in range(3)]
                for mode in self.shape
            ]
        )
        return np.asarray(shape @ np.asarray(vector, float))

    def motion(self, at_m: float, direction: str) -> Real:
        """(m,) motion of each mode at a station in a direction of the pipe there."""
        nearest = int(np.argmin(np.abs(self.station_m - at_m)))
        return self.along(at_m, axis_vectors(self.tangent[nearest], direction)[0])

    def seen(self, at_m: float, struck_m: float, direction: str, share: float = 0.02) -> Real:
        """(k,) frequencies that a blow shows there: those with some share of the largest gain."""
        gain = np.abs(self.motion(at_m, direction) * self.motion(struck_m, direction))
        return np.asarray(self.frequency_hz[gain > max(share * gain.max(), _LEAST_GAIN)])


def plant_of(
    span: Span,
    state: State,
    *,
    name: str,
    up_to_hz: float,
    seed: int = 1,
    machine: PracticeMachine | None = None,
) -> PracticePlant:
    """The span in a state as a plant to practise on, modes up to a frequency.

    Each mode's damping is drawn between 0.6 and 1.8 %. Raises Refusal where the span has no stable
    equilibrium.
    """
    structure = assemble(span, state, up_to_hz=up_to_hz)
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    frequency_hz, vectors = solve(stiffness, mass, up_to_hz=up_to_hz)
    draw = np.random.default_rng(seed).random(len(frequency_hz))
    damping = _LEAST_DAMPING * (_MOST_DAMPING / _LEAST_DAMPING) ** draw
    shape = vectors.T.reshape(len(frequency_hz), -1, 6)[:, :, :3]
    return PracticePlant(
        name, frequency_hz, damping, structure.station_m, structure.tangent, shape, machine
    )
