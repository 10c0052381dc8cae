"""The part of the app that holds the job and its results, and lets threads work on them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from textual import work
from textual.app import App
from textual.worker import Worker, WorkerState, get_current_worker

from fieldkit.ui import messages as say
from fieldkit.ui import work as core
from fieldkit.ui.desk import Desk
from fieldkit.ui.document import OpenJob
from fieldkit.ui.words import safe

if TYPE_CHECKING:
    from fieldkit.detune.verdict import Verdict
    from fieldkit.job.document import Job, RecordingEntry
    from fieldkit.job.store import JobText
    from fieldkit.workup import Workup


class JobApp(App[None]):
    """Holds one open job; every edit starts the work anew and makes older results stale."""

    def __init__(self) -> None:
        super().__init__()
        self._open_job: OpenJob | None = None
        self.desk = Desk()
        self.ticket = 0
        """Number of the work under way; a result with another number is dropped."""

    @property
    def open_job(self) -> OpenJob | None:
        """The text of the job, and the way back."""
        return self._open_job

    @open_job.setter
    def open_job(self, opened: OpenJob | None) -> None:
        self._open_job = opened
        self.job_changed(opened)

    def job_changed(self, opened: OpenJob | None) -> None:
        """The text of the job is another, or it was saved."""

    def begin_afresh(self) -> None:
        """Another job is about to come on the desk."""

    def refresh_desk(self) -> None:
        """Show what lies on the desk."""
        raise NotImplementedError

    def say_progress(self, doing: str, fraction: float | None = None) -> None:
        """Show what is being done; an empty text clears it."""
        raise NotImplementedError

    def action_view(self, name: str) -> None:
        """Go to a view."""
        raise NotImplementedError

    def tell(self, sentence: str, *, wrong: bool = False) -> None:
        """One sentence in a corner, never parsed as markup."""
        self.notify(safe(sentence), severity="error" if wrong else "information", markup=False)

    def put(self, **changes: object) -> None:
        """Change what lies on the desk and show it."""
        self.desk = replace(self.desk, **changes)  # type: ignore[arg-type]
        self.refresh_desk()

    def begin(self, opened: OpenJob, job: Job) -> None:
        """Lay another job on an empty desk and work it out."""
        self.begin_afresh()
        self.desk = Desk(job=job, text=opened.text)
        self.open_job = opened
        self.start_work()

    def take(self, opened: OpenJob, job: Job) -> None:
        """Go on with a changed text of the same job; results stand until newer ones come."""
        self.desk = replace(
            self.desk, job=job, text=opened.text, chosen=None, chosen_modes=(), traces={}
        )
        self.open_job = opened
        self.start_work()

    def start_work(self) -> None:
        """Work the whole job out in a thread."""
        if self.desk.job is None:
            return
        self.ticket += 1
        self.put(working=True, stopped=False, failed="", fresh=())
        self.say_progress("reading")
        self.work_up(self.desk.job, self.ticket)

    def stop_work(self) -> None:
        """Ask the thread to stop; it does at its next step."""
        if self.desk.working:
            self.workers.cancel_group(self, "workup")
            self.say_progress("stopping")

    @work(thread=True, exclusive=True, exit_on_error=False, group="open")
    def read_job(self, path: Path) -> None:
        """Read a job file in a thread: the first one loads the libraries."""
        core.open_job(path, self.post_message)

    @work(thread=True, exclusive=True, exit_on_error=False, group="workup")
    def work_up(self, job: Job, ticket: int) -> None:
        """The chain, in a thread."""
        worker = get_current_worker()
        core.work_up(job, ticket, self.post_message, lambda: worker.is_cancelled)

    @work(thread=True, exclusive=True, exit_on_error=False, group="fix")
    def shape_fix(self, job: Job, verdict: Verdict, ticket: int) -> None:
        """Mode shapes with a fix, in a thread."""
        core.shape_fix(job, verdict, ticket, self.post_message)

    @work(thread=True, exit_on_error=False, group="trace")
    def load_trace(self, entry: RecordingEntry) -> None:
        """The samples of a recording, in a thread."""
        core.load_trace(entry, self.post_message)

    @work(thread=True, exit_on_error=False, group="warm")
    def warm_libraries(self) -> None:
        """Load what the first answer needs while the user looks around."""
        core.warm()

    def on_worker_state_changed(self, event: Worker.StateChanged) -> None:
        """A thread that fell over is told in a sentence."""
        if event.state is WorkerState.ERROR and isinstance(event.worker.error, Exception):
            self.tell(core.unexpected(event.worker.error), wrong=True)

    def on_work_step(self, message: say.WorkStep) -> None:
        """Progress of the newest work only."""
        if message.ticket == self.ticket and self.desk.working:
            self.say_progress(message.doing, message.fraction)

    def on_span_ready(self, message: say.SpanReady) -> None:
        """Computed modes."""
        if message.ticket == self.ticket:
            self.put(states=message.states, span_refused=message.refused)

    def on_part_ready(self, message: say.PartReady) -> None:
        """A step of the first run; after an edit the older results stand until all is done."""
        first = self.desk.workup is None or bool(self.desk.fresh)
        if message.ticket == self.ticket and self.desk.working and first:
            self.put(workup=message.workup, fresh=message.workup.done)

    def on_workup_ready(self, message: say.WorkupReady) -> None:
        """The whole chain."""
        if message.ticket == self.ticket:
            self.say_progress("")
            self.put(workup=message.workup, working=False)
            self._choose_best(message.workup)

    def _choose_best(self, found: Workup) -> None:
        """The ruler shows the best fix until another is chosen."""
        if found.detuning is not None and found.detuning.fixes:
            self.on_fix_chosen(say.FixChosen(found.detuning.fixes[0]))

    def on_work_failed(self, message: say.WorkFailed) -> None:
        """No result, and why."""
        if message.ticket == self.ticket:
            self.say_progress("")
            self.put(workup=None, working=False, failed=message.sentence)
            self.tell(message.sentence, wrong=True)

    def on_work_stopped(self, message: say.WorkStopped) -> None:
        """Stopped as asked."""
        if message.ticket == self.ticket:
            self.say_progress("")
            self.put(working=False, stopped=True)
            self.tell("Stopped. Press r to work the job out again.")

    def on_fix_chosen(self, message: say.FixChosen) -> None:
        """The ruler and the drawing follow the cursor in the list of fixes."""
        if self.desk.job is None or message.verdict == self.desk.chosen:
            return
        self.put(chosen=message.verdict, chosen_modes=())
        self.shape_fix(self.desk.job, message.verdict, self.ticket)

    def on_fix_shaped(self, message: say.FixShaped) -> None:
        """Mode shapes of the fix under the cursor."""
        if message.ticket == self.ticket and message.verdict == self.desk.chosen:
            self.put(chosen_modes=message.modes)

    def on_trace_wanted(self, message: say.TraceWanted) -> None:
        """Load a recording once, for as long as the job is worked out the same way."""
        if message.entry not in self.desk.traces:
            self.load_trace(message.entry)

    def on_trace_ready(self, message: say.TraceReady) -> None:
        """Samples of a recording."""
        self.put(traces={**self.desk.traces, message.entry: message.samples})

    def change_text(self, changed: Callable[[], JobText]) -> bool:
        """Take a changed text; False, and one sentence, where it does not hold together."""
        from fieldkit.errors import FieldkitError

        if self.open_job is None:
            return False
        try:
            text = changed()
            job = text.job()
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return False
        self.take(self.open_job.edited(text), job)
        return True
