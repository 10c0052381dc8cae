"""Opening, saving and leaving: everything that touches the disk, with its questions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from textual import work

from fieldkit.errors import FieldkitError
from fieldkit.ui import messages as say
from fieldkit.ui.dialogs import AskScreen, PathScreen, PickScreen
from fieldkit.ui.document import OpenJob
from fieldkit.ui.keeping import RESTORE, Keeping, restore_question
from fieldkit.ui.sheet_writing import SheetWriting

if TYPE_CHECKING:
    from fieldkit.job.document import Job
    from fieldkit.job.journal import Kept
    from fieldkit.ui.start.start_screen import Chosen

SAVE_QUESTION = (("save", "Save"), ("discard", "Leave unsaved"), ("back", "Back"))


class Files(SheetWriting, Keeping):
    """The app's dealings with files."""

    def begin(self, opened: OpenJob, job: Job) -> None:
        """Lay another job on the desk, and remember that it was opened."""
        super().begin(opened, job)
        if opened.path is not None:
            self.remember(opened.path, "")

    def on_workup_ready(self, message: say.WorkupReady) -> None:
        """What it came to goes beside its name in the list of recent jobs."""
        opened = self.open_job
        if message.ticket != self.ticket or opened is None or opened.path is None:
            return
        if not opened.unsaved:
            from fieldkit.ui.start.standing import standing

            self.remember(opened.path, standing(message.workup))

    @work(thread=True, exit_on_error=False, group="recent")
    def remember(self, path: Path, state: str) -> None:
        """Put a job at the head of the recent ones, in a thread."""
        from fieldkit.job.recent import remember

        remember(path, state)

    @work(exclusive=True, group="welcome")
    async def welcome(self) -> None:
        """Where to start; asked again until there is a job, or the user wants to look around."""
        from fieldkit.ui.start.start_screen import StartScreen

        while self.desk.job is None:
            chosen = await self.push_screen_wait(StartScreen())
            if chosen is None or await self.start_with(chosen):
                return

    async def start_with(self, chosen: Chosen) -> bool:
        """Go the way that was chosen; False to ask again."""
        if chosen.way == "recent" and chosen.path is not None:
            return self.open_path(chosen.path)
        if chosen.way == "restore" and chosen.kept is not None:
            return await self.take_up(chosen.kept)
        ways = {"new": self.describe_new, "open": self.pick_job, "sample": self.pick_sample}
        if chosen.way in ways:
            return await ways[chosen.way]()
        await self.run_action(chosen.way)
        return True

    async def take_up(self, kept: Kept) -> bool:
        """Go on with what was never saved."""
        raise NotImplementedError

    async def describe_new(self) -> bool:
        """A new job, step by step; False where the user left it."""
        raise NotImplementedError

    def open_path(self, path: Path) -> bool:
        """Read a job file in a thread."""
        self.say_progress("opening")
        self.read_job(path)
        return True

    async def on_job_opened(self, message: say.JobOpened) -> None:
        """A job file was read; what is kept beside it is offered first."""
        self.open_read(message)

    @work(exclusive=True, group="opened")
    async def open_read(self, message: say.JobOpened) -> None:
        """Lay it on the desk, with or without the changes that were never saved."""
        from fieldkit.job import journal

        text = message.text
        kept = journal.kept_for(text.path, text.text) if text.path else None
        if kept is not None and await self._offered(kept, message):
            return
        self.begin(OpenJob(text, text), message.job)

    async def _offered(self, kept: Kept, message: say.JobOpened) -> bool:
        """Ask about unsaved changes; True where that decided what comes on the desk."""
        from fieldkit.job import journal

        question = restore_question(kept, message.text.text)
        self.say_progress("")
        answer = await self.push_screen_wait(AskScreen(question, RESTORE))
        if answer == "discard":
            journal.drop(kept.key)
            return False
        if answer == "restore":
            self.restore(kept, OpenJob(message.text, message.text), message.job)
        elif self.desk.job is None:
            self.welcome()
        return True

    def restore(self, kept: Kept, opened: OpenJob, job: Job) -> None:
        """The changes that were kept, on top of the job as saved."""
        text = replace(opened.text, text=kept.text) if kept.text else opened.text
        try:
            changed = text.job()
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            self.begin(opened, job)
            return
        again = opened.edited(text) if text.text != opened.text.text else opened
        self.begin(again, changed)
        if again.unsaved:
            self.tell("Taken up where it was left; not saved yet: ctrl+s saves it.")
        if kept.typing:
            self.reopen_form(kept.typing)

    def reopen_form(self, typing: Mapping[str, Any]) -> None:
        """Go on with a form that was open."""
        raise NotImplementedError

    def on_open_failed(self, message: say.OpenFailed) -> None:
        """A job file could not be read: the one on the desk stays, or the start comes again."""
        self.say_progress("")
        self.mend(message.path)

    @work(exclusive=True, group="mend")
    async def mend(self, path: Path) -> None:
        """Show where a job file is wrong, and offer the user's editor."""
        if not await self.mended(path) and self.desk.job is None:
            self.welcome()

    async def mended(self, path: Path) -> bool:
        """Whether the user brought the file into order."""
        raise NotImplementedError

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
    async def action_start(self) -> None:
        """The start screen, from a job that is open."""
        from fieldkit.ui.start.start_screen import StartScreen

        if await self.may_go_on():
            chosen = await self.push_screen_wait(StartScreen())
            if chosen is not None:
                await self.start_with(chosen)

    @work
    async def action_open(self) -> None:
        """Open a job file."""
        if await self.may_go_on():
            await self.pick_job()

    async def pick_job(self) -> bool:
        """Pick a job file among the recent ones and those of a folder."""
        from fieldkit.job.recent import recents
        from fieldkit.ui.start.picker import FilePicker, Place
        from fieldkit.ui.start.standing import about_job

        here = self.open_job.path.parent if self.open_job and self.open_job.path else Path.cwd()
        recent = [Place(Path(one.path), Path(one.path).name) for one in recents()]
        picker = FilePicker("Open a job file", here, (".toml",), about_job, recent, what="job file")
        path = await self.push_screen_wait(picker)
        return path is not None and self.open_path(path)

    @work
    async def action_sample(self) -> None:
        """Copy the sample jobs out and open one of them."""
        if await self.may_go_on():
            await self.pick_sample()

    async def pick_sample(self) -> bool:
        """Copy the samples into a folder and open one; False where the user left it."""
        from fieldkit.cli.samples import copy_samples

        start = str(Path.cwd() / "fieldkit-samples")
        asked = PathScreen("Copy the sample jobs into which folder?", start, must_exist=False)
        folder = await self.push_screen_wait(asked)
        if folder is None:
            return False
        try:
            jobs = copy_samples(folder)
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return False
        offered = [(str(number), job.parent.name) for number, job in enumerate(jobs)]
        picked = await self.push_screen_wait(PickScreen("Open which sample?", offered))
        return picked is not None and self.open_path(jobs[int(picked)])

    @work
    async def action_quit(self) -> None:  # type: ignore[override]
        """Leave; asks first when something is unsaved."""
        if await self.may_go_on():
            self.forget_unsaved()
            self.stop_work()
            self.exit()
