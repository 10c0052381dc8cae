"""The whole sheet of a job, part by part, before it is rendered."""

from __future__ import annotations

from fieldkit.progress import Progress
from fieldkit.sheet.basis import Basis
from fieldkit.sheet.beyond import Results, results
from fieldkit.sheet.content import Document
from fieldkit.sheet.part_answer import answer
from fieldkit.sheet.part_basis import assumptions, limits, program, provenance
from fieldkit.sheet.part_changes import bands, changes
from fieldkit.sheet.part_match import match
from fieldkit.sheet.part_measured import modes, recordings, spectra, taps
from fieldkit.sheet.part_models import computed, handbook
from fieldkit.sheet.part_running import running
from fieldkit.sheet.part_span import span
from fieldkit.workup import Workup, simulated_notice


def sheet(work: Workup, basis: Basis, progress: Progress | None = None) -> Document:
    """Everything that another engineer needs to check the answer by hand."""
    return composed(results(work, basis, progress))


def composed(found: Results) -> Document:
    """The sheet of results that are all at hand."""
    work, basis = found.work, found.basis
    forbidden = work.detuning.bands if work.detuning else ()
    notice = simulated_notice(work.simulated)
    return Document(
        work.job.title,
        (
            ("Job file", basis.job.name),
            ("last changed", basis.job_date),
            ("sheet written", basis.written),
            ("by", program()),
        ),
        (notice,) if notice else (),
        (
            answer(found),
            recordings(found),
            taps(found),
            modes(found),
            spectra(found, forbidden),
            running(found, forbidden),
            span(found),
            handbook(found),
            computed(found),
            match(found),
            bands(found),
            changes(found),
            assumptions(found),
            limits(found),
            provenance(found),
        ),
        program(),
    )
