"""The curves of one ranked change, judged on members that had no say in the ranking."""

from __future__ import annotations

from fieldkit.detune.candidates import Search
from fieldkit.detune.curves import FixCurve, fix_curve
from fieldkit.detune.fixes import Change
from fieldkit.detune.matched import Match
from fieldkit.detune.rank import afresh
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.workup.chance import search_of


def curve_search(job: Job, matched: Match | None) -> Search:
    """What the curves of a job are judged in.

    Raises InputError without an excitation, Refusal where the span cannot be solved.
    """
    return afresh(search_of(job, matched), matched)


def curve_of(
    job: Job,
    search: Search,
    change: Change,
    kind: str,
    progress: Progress | None = None,
) -> FixCurve:
    """The curve of a change against ``place``, ``stiffness`` or ``mass``.

    Raises InputError where the change has no such size.
    """
    return fix_curve(search, job.running, change, kind, progress)
