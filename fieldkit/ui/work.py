"""What the worker threads do: call the core, post the result, turn every error into a sentence.

Nothing here touches a widget; ``post`` is thread-safe and everything else is the core's.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from textual.message import Message

from fieldkit.errors import Cancelled, FieldkitError
from fieldkit.progress import Progress
from fieldkit.ui import messages as say

if TYPE_CHECKING:
    from fieldkit.detune.verdict import Verdict
    from fieldkit.job.document import Job, RecordingEntry

Post = Callable[[Message], object]
Stop = Callable[[], bool]


def warm() -> None:
    """Load the slow libraries, so that the first answer does not wait for them.

    What reads a job and its quantities comes first: it is needed while one is typed.
    """
    import fieldkit.job.convert  # noqa: F401
    from fieldkit.quantity import show
    from fieldkit.span.pipes import known_sizes

    show(1.0, "length")
    known_sizes()
    import scipy.linalg
    import scipy.ndimage
    import scipy.optimize
    import scipy.sparse.csgraph
    import scipy.sparse.linalg
    import scipy.special  # noqa: F401

    from fieldkit import workup  # noqa: F401


def open_job(path: Path, post: Post) -> None:
    """Read a job file."""
    try:
        from fieldkit.job.store import load_text

        text = load_text(path)
        post(say.JobOpened(text, text.job()))
    except FieldkitError as error:
        post(say.OpenFailed(path, str(error)))
    except Exception as error:
        post(say.OpenFailed(path, unexpected(error)))


def work_up(job: Job, ticket: int, post: Post, stop: Stop) -> None:
    """The computed modes first, for they are quick; then the whole chain."""
    progress = Progress(lambda doing, share: post(say.WorkStep(ticket, doing, share)), stop)
    try:
        from fieldkit import workup

        post(_span_modes(job, ticket))
        found = workup.run(job, progress, lambda part: post(say.PartReady(ticket, part)))
        post(say.WorkupReady(ticket, found))
    except Cancelled:
        post(say.WorkStopped(ticket))
    except FieldkitError as error:
        post(say.WorkFailed(ticket, str(error)))
    except Exception as error:
        post(say.WorkFailed(ticket, unexpected(error)))


def _span_modes(job: Job, ticket: int) -> say.SpanReady:
    from fieldkit.workup import state_modes

    try:
        return say.SpanReady(ticket, state_modes(job, Progress()))
    except FieldkitError as error:
        return say.SpanReady(ticket, (), str(error))


def load_trace(entry: RecordingEntry, post: Post) -> None:
    """The samples that a recording entry names, or their outline where they are many."""
    from fieldkit.signal.outline import outline
    from fieldkit.signal.source import as_far_as_readable, open_recording

    try:
        source = open_recording(entry.path, rate_hz=entry.rate_hz)
        samples, _ = as_far_as_readable(source, lambda whole: outline(whole, entry.channel))
        post(say.TraceReady(entry, samples))
    except FieldkitError:
        post(say.TraceReady(entry, np.empty(0)))


def shape_fix(job: Job, verdict: Verdict, ticket: int, post: Post) -> None:
    """Mode shapes of the span with a fix applied, running state."""
    from fieldkit.span.modes import span_modes

    try:
        span = verdict.change.apply(job.span)
        post(say.FixShaped(ticket, verdict, span_modes(span, job.running, job.goal.up_to_hz)))
    except FieldkitError:
        post(say.FixShaped(ticket, verdict, ()))


def unexpected(error: Exception) -> str:
    """A fault of the program, told as a sentence."""
    return (
        f"something went wrong inside fieldkit ({type(error).__name__}: {error}); "
        "the job is unharmed: save it, undo the last edit (u), and report this line"
    )
