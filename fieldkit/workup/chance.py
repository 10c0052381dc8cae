"""The search for changes of one job, made ready: for the chance map and for judging one change."""

from __future__ import annotations

from collections.abc import Callable

from fieldkit.detune.candidates import Search
from fieldkit.detune.matched import Match
from fieldkit.detune.rank import prepare
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job
from fieldkit.job.schema import require_excitation
from fieldkit.progress import Progress
from fieldkit.workup.chain import matching, measured, state_modes

UNTAPPED = (
    "nothing was measured on this pipe: the chances rest on what supports of this kind are usually "
    "worth; tap it before buying steel"
)


def search_of(job: Job, matched: Match | None, progress: Progress | None = None) -> Search:
    """What changes of a job are looked for in; on the prior where there is no match.

    Raises InputError without an excitation, Refusal where the span cannot be solved.
    """
    require_excitation(job)
    span, tapped, running = job.span, job.tapped, job.running
    return prepare(span, tapped, running, matched, job.excitations, job.goal, progress)[0]


def searched(job: Job, progress: Progress) -> tuple[Search, tuple[str, ...]]:
    """The search on what was measured, and what to mind.

    Raises Refusal where a tap cannot be used or the model does not explain it.
    """
    evidence = measured(job, progress.within(0.0, 0.4))
    if not evidence.modes:
        return search_of(job, None, progress), (*evidence.warnings, UNTAPPED)
    states = state_modes(job, progress.within(0.4, 0.5))
    matched = _if_firm(
        lambda: matching(job, evidence, states, progress.within(0.5, 0.9)), evidence.firm
    )
    notes = matched.warnings if matched else (UNTAPPED,)
    return search_of(job, matched, progress.within(0.9, 1.0)), (*evidence.warnings, *notes)


def _if_firm(match: Callable[[], Match], firm: object) -> Match | None:
    """The match; without one only where nothing was tapped that it would have to explain."""
    try:
        return match()
    except (Refusal, InputError):
        if firm:
            raise
        return None
