"""Equal spacing for the line of a job, its supports as the tap found them or as is usual."""

from __future__ import annotations

import numpy as np

from fieldkit.detune.excitation import bands
from fieldkit.detune.matched import Match
from fieldkit.detune.spacing import (
    USUAL_SPANS,
    Held,
    SpacingAnswer,
    SupportRow,
    equal_spacing,
    prior_row,
    row_kinds,
    usual_kind,
)
from fieldkit.detune.unknowns import unknowns_of
from fieldkit.errors import InputError
from fieldkit.job.document import Job
from fieldkit.span.supports import springs


def spacing(
    job: Job, match: Match | None = None, *, kind: str | None = None, spans: int = USUAL_SPANS
) -> SpacingAnswer:
    """Frequency against equal spacing in the running state.

    ``kind`` of the supports: the one that the job has most of, where left out. Raises InputError
    for a kind that does not hold a line both ways.
    """
    kind = kind or usual_kind(job.span)
    row = prior_row(job.span, kind) if kind in row_kinds() else None
    if row is None:
        raise InputError(
            f"a row of supports cannot be of the kind {kind}",
            f"use one of {', '.join(row_kinds())}",
        )
    if match is not None:
        row = _as_tapped(job, match, row)
    forbidden = bands(job.excitations, job.goal.margin)
    return equal_spacing(job.span, job.running, row, forbidden, job.goal.up_to_hz, spans)


def _as_tapped(job: Job, match: Match, row: SupportRow) -> SupportRow:
    """The row with what the ensemble says of the job's own supports of that kind."""
    vertical, lateral = (_ensemble(job, match, row.kind, axis) for axis in ("vertical", "lateral"))
    if vertical is None or lateral is None:
        return row
    return SupportRow(row.kind, vertical, lateral, "tap")


def _ensemble(job: Job, match: Match, kind: str, axis: str) -> Held | None:
    """Stiffness along an axis of all supports of a kind together; None where none is unknown."""
    every = springs(job.span)
    columns = [
        unknown.at(match.ensemble.standard[:, i])
        for i, unknown in enumerate(unknowns_of(job.span, (job.tapped, job.running)))
        if unknown.role == "spring"
        and every[unknown.index].axis == axis
        and job.span.supports[every[unknown.index].support].kind == kind
    ]
    if not columns:
        return None
    low, median, high = np.quantile(np.concatenate(columns), (0.05, 0.5, 0.95))
    return Held(float(median), float(low), float(high))
