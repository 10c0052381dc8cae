"""The modes a job's model expects a tap to show, for advice on where to strike next."""

from __future__ import annotations

import numpy as np

from fieldkit.capture.enough import Expected
from fieldkit.job.document import Job
from fieldkit.span.layout import axis_vectors
from fieldkit.span.modes import Mode, span_modes

_MOVES = 0.3
"""Share of a mode's largest motion below which a direction does not show it."""


def expected_modes(job: Job, direction: str | None) -> tuple[Expected, ...]:
    """Modes of the tapped state that move in a direction, and where; none without a direction.

    Unknowns stand at their medians. Raises Refusal where the span has no stable equilibrium.
    """
    if direction is None:
        return ()
    modes = span_modes(job.span, job.tapped, job.goal.up_to_hz)
    found = [_expected(job, mode, direction) for mode in modes]
    return tuple(mode for mode in found if mode is not None)


def _expected(job: Job, mode: Mode, direction: str) -> Expected | None:
    tangents = [job.span.centre_line.at(float(at_m))[1] for at_m in mode.station_m]
    along = [axis_vectors(tangent, direction) for tangent in tangents]
    motion = np.array(
        [np.linalg.norm(v @ moved) for v, moved in zip(along, mode.shape, strict=True)]
    )
    if motion.max() < _MOVES:
        return None
    return Expected(mode.frequency_hz, mode.station_m, motion / motion.max())
