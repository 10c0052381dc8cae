"""Whether a finer mesh would change the computed modes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fieldkit.errors import Refusal
from fieldkit.job.document import Job
from fieldkit.span.layout import Span, State
from fieldkit.span.modes import TWIST, direction_shares, solve, span_matrices
from fieldkit.span.structure import Structure, assemble
from fieldkit.span.supports import springs


@dataclass(frozen=True)
class Convergence:
    """The modes of one state on the mesh in use, and on one with its elements cut in two."""

    state: str
    elements: int
    longest_element_m: float
    frequency_hz: tuple[float, ...]
    finer_elements: int = 0
    """More than twice as many where short stretches take a least number of elements."""
    finer_hz: tuple[float, ...] = ()
    """As many as were found on both."""
    refused: str = ""
    """Why there is no finer mesh."""

    @property
    def largest_change(self) -> float | None:
        """Of any frequency, relative; None where nothing was compared."""
        pairs = zip(self.frequency_hz, self.finer_hz, strict=False)
        return max((abs(fine / coarse - 1) for coarse, fine in pairs), default=None)


def convergence(job: Job) -> tuple[Convergence, ...]:
    """Of both states, tapped then running."""
    return tuple(
        one_convergence(job.span, state, job.goal.up_to_hz) for state in (job.tapped, job.running)
    )


def one_convergence(span: Span, state: State, up_to_hz: float) -> Convergence:
    """Of one state; Refusal where the span has no modes to compute."""
    coarse = assemble(span, state, up_to_hz=up_to_hz)
    found = Convergence(
        state.name,
        len(coarse.element_length_m),
        float(coarse.element_length_m.max()),
        _frequencies(span, coarse, up_to_hz),
    )
    middles = tuple(float(station) for station in coarse.element_station_m)
    try:
        fine = assemble(span, state, up_to_hz=up_to_hz, extra_stations_m=middles)
        finer_hz = _frequencies(span, fine, up_to_hz)
    except Refusal as refusal:
        return _with(found, refused=str(refusal))
    return _with(found, elements=len(fine.element_length_m), hz=finer_hz)


def _with(
    found: Convergence, elements: int = 0, hz: tuple[float, ...] = (), refused: str = ""
) -> Convergence:
    common = min(len(found.frequency_hz), len(hz))
    return Convergence(
        found.state,
        found.elements,
        found.longest_element_m,
        found.frequency_hz,
        elements,
        hz[:common],
        refused,
    )


def _frequencies(span: Span, structure: Structure, up_to_hz: float) -> tuple[float, ...]:
    """Of every mode that is felt: those that only twist the pipe are left out."""
    stiffness, mass = span_matrices(structure, springs(span), span.masses)
    frequency_hz, vectors = solve(stiffness, mass, up_to_hz=up_to_hz)
    twist = direction_shares(structure, span.masses, vectors)[:, 3]
    return tuple(float(f) for f in frequency_hz[np.asarray(twist) < TWIST])
