"""The findings of a job whose running records are at hand, without ranking any change."""

from __future__ import annotations

from collections.abc import Sequence

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.matched import Match
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.workup.chain import gather, matching
from fieldkit.workup.evidence import with_running_modes
from fieldkit.workup.findings import Findings, findings, running_findings
from fieldkit.workup.readings import RunningReading


def diagnosed(job: Job | None, readings: Sequence[RunningReading], progress: Progress) -> Findings:
    """What these records come to; without a job there is their severity only.

    A tap that cannot be read or matched leaves the verdicts to what else is known.
    """
    if job is None:
        return Findings(running=running_findings(None, readings, ()))
    try:
        evidence = gather(job, progress.within(0.0, 0.4))[1]
    except (Refusal, InputError):
        evidence = Evidence(job.measured)
    evidence = with_running_modes(evidence, readings)
    matched = _matched(job, evidence, progress.within(0.4, 0.9))
    try:
        return findings(job, evidence, readings, matched, None, progress.within(0.9, 1.0))
    except (Refusal, InputError):
        return Findings(running=running_findings(job, readings, ()))


def _matched(job: Job, evidence: Evidence, progress: Progress) -> Match | None:
    if not evidence.modes:
        return None
    try:
        return matching(job, evidence, (), progress)
    except (Refusal, InputError):
        return None
