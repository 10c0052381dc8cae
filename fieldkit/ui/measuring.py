"""Measuring from the app: a job to measure for, then the screens of live capture.

They are loaded when the key is pressed: the first paint does not wait for them.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from textual import work

from fieldkit.errors import FieldkitError
from fieldkit.ui.dialogs import PathScreen, PickScreen
from fieldkit.ui.document import OpenJob
from fieldkit.ui.text_editing import TextEditing

if TYPE_CHECKING:
    from fieldkit.ui.capture.bench import Bench
    from fieldkit.ui.capture.wiring import Wiring

WITHOUT_JOB = (
    ("practise", "Practise  on a simulated booster line: no sensor, no pipe needed"),
    ("new", "New       describe my pipe, then tap it"),
    ("open", "Open      the job file of my pipe"),
)


class Measuring(TextEditing):
    """The app's dealings with inputs."""

    def __init__(self) -> None:
        super().__init__()
        self.bench: Bench | None = None
        """Where inputs come from; None: from this computer."""
        self.wiring: Wiring | None = None
        """What was measured with last."""

    @work(exclusive=True, group="measure")
    async def action_measure(self, kind: str = "tap") -> None:
        """Set up, measure, and take it into the job."""
        if not await self._job_to_measure():
            return
        from fieldkit.ui.capture.bench import Bench
        from fieldkit.ui.capture.flow import measure

        await measure(self, kind, self.bench or Bench())

    @work(exclusive=True, group="measure")
    async def action_practise(self) -> None:
        """A guided tap test on a simulated pipe."""
        from fieldkit.ui.capture.bench import Bench
        from fieldkit.ui.capture.flow import measure

        if await self._practice_job():
            await measure(self, "tap", self.bench or Bench())

    async def _job_to_measure(self) -> bool:
        """A job with a file: recordings lie beside it. False where there is none."""
        if self.open_job is None:
            picked = await self.push_screen_wait(PickScreen("Measure for which job?", WITHOUT_JOB))
            if picked == "practise":
                return await self._practice_job()
            if picked == "open":
                self.action_open()
            if picked != "new" or not await self.describe_new():
                return False
        if self.open_job is not None and self.open_job.path is None:
            self.tell("Recordings lie beside the job file: save it first.")
            return await self.save_somewhere(None)
        return self.open_job is not None

    async def _practice_job(self) -> bool:
        """The description of a sample, to practise on, in a file of its own."""
        from fieldkit.cli.samples import sample_jobs
        from fieldkit.job.store import load_text
        from fieldkit.ui.capture.takes import free_path, practice_copy

        if not await self.may_go_on():
            return False
        start = free_path(Path.cwd(), "practice")
        asked = PathScreen("Keep the practice job as", str(start), must_exist=False)
        path = await self.push_screen_wait(asked)
        if path is None:
            return False
        try:
            saved = practice_copy(load_text(sample_jobs()[0]), path).save()
            self.begin(OpenJob(saved, saved), saved.job())
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return False
        return True
