"""Opening, saving and leaving: everything that touches the disk, with its questions."""

from __future__ import annotations

from pathlib import Path

from textual import work

from fieldkit.errors import FieldkitError
from fieldkit.ui.dialogs import AskScreen, PathScreen, PickScreen
from fieldkit.ui.sheet_writing import SheetWriting

SAVE_QUESTION = (("save", "Save"), ("discard", "Leave unsaved"), ("back", "Back"))
WELCOME = (
    ("sample", "Sample   copy the sample jobs out and open one"),
    ("open", "Open     a job file"),
    ("new", "New      an empty description to fill in"),
    ("practise", "Practise tap a simulated pipe: no sensor needed"),
)


class Files(SheetWriting):
    """The app's dealings with files."""

    @work
    async def welcome(self) -> None:
        """What to start with."""
        choice = await self.push_screen_wait(PickScreen("fieldkit: where to start?", WELCOME))
        if choice is not None:
            await self.run_action(choice)

    async def may_go_on(self) -> bool:
        """Ask what to do with unsaved changes; False to stay."""
        if self.open_job is None or not self.open_job.unsaved:
            return True
        question = f"“{self.desk.job.title if self.desk.job else 'The job'}” has unsaved changes."
        answer = await self.push_screen_wait(AskScreen(question, SAVE_QUESTION))
        if answer == "save":
            return await self.save_somewhere(self.open_job.path)
        return answer == "discard"

    async def save_somewhere(self, path: Path | None) -> bool:
        """Write the job to a path, asking for one where there is none; False when it was not."""
        if self.open_job is None:
            self.tell("There is no job to save.")
            return False
        if path is None:
            start = str(self.open_job.path or Path.cwd() / "job.toml")
            path = await self.push_screen_wait(
                PathScreen("Save the job as", start, must_exist=False)
            )
        if path is None:
            return False
        return self._written(path)

    def _written(self, path: Path) -> bool:
        if self.open_job is None:
            return False
        elsewhere = self.open_job.path != path
        try:
            self.open_job = self.open_job.as_saved(self.open_job.text.save(path))
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return False
        self.tell(f"Saved {path}")
        if elsewhere:
            self.take(self.open_job, self.open_job.text.job())
        self.refresh_desk()
        return True

    @work
    async def action_save(self) -> None:
        """Write the job file."""
        await self.save_somewhere(self.open_job.path if self.open_job else None)

    @work
    async def action_save_as(self) -> None:
        """Write the job under another name."""
        await self.save_somewhere(None)

    @work
    async def action_open(self) -> None:
        """Open a job file."""
        if not await self.may_go_on():
            return
        start = f"{self.open_job.path.parent}/" if self.open_job and self.open_job.path else ""
        path = await self.push_screen_wait(PathScreen("Open a job file", start, must_exist=True))
        if path is not None:
            self.say_progress("opening")
            self.read_job(path)

    @work
    async def action_sample(self) -> None:
        """Copy the sample jobs out and open one of them."""
        from fieldkit.cli.samples import copy_samples

        if not await self.may_go_on():
            return
        start = str(Path.cwd() / "fieldkit-samples")
        asked = PathScreen("Copy the sample jobs into which folder?", start, must_exist=False)
        folder = await self.push_screen_wait(asked)
        if folder is None:
            return
        try:
            jobs = copy_samples(folder)
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return
        offered = [(str(number), job.parent.name) for number, job in enumerate(jobs)]
        picked = await self.push_screen_wait(PickScreen("Open which sample?", offered))
        if picked is not None:
            self.say_progress("opening")
            self.read_job(jobs[int(picked)])

    @work
    async def action_quit(self) -> None:  # type: ignore[override]
        """Leave; asks first when something is unsaved."""
        if await self.may_go_on():
            self.stop_work()
            self.exit()
