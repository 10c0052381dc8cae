"""Write the sheet of the open job: as a page, as Markdown, or packed with its recordings."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from textual import work

from fieldkit.errors import FieldkitError
from fieldkit.ui import work as core
from fieldkit.ui.dialogs import PathScreen, PickScreen
from fieldkit.ui.job_app import JobApp

if TYPE_CHECKING:
    from fieldkit.workup import Workup

FORMATS = (
    (".html", "Page       one HTML file for screen and paper"),
    (".md", "Markdown   the same as text"),
    (".zip", "Bundle     job, recordings and sheet in one zip for the office"),
)


class SheetWriting(JobApp):
    """The app's way from a finished workup to a file."""

    @work
    async def action_write_sheet(self) -> None:
        """Ask what and where, then write it in a thread."""
        if self.desk.workup is None or self.desk.working:
            self.tell("There is no result to write down yet.")
            return
        work_up, text = self.desk.workup, self.open_job.text.text if self.open_job else None
        suffix = await self.push_screen_wait(PickScreen("Write the sheet as what?", FORMATS))
        if suffix is None:
            return
        asked = PathScreen("Write the sheet to", self._start(suffix), must_exist=False)
        path = await self.push_screen_wait(asked)
        if path is not None:
            self.say_progress("writing the sheet")
            self.write_sheet(work_up, text, path)

    def _start(self, suffix: str) -> str:
        own = self.open_job.path if self.open_job else None
        name = f"{own.stem if own else 'job'}-sheet{suffix}"
        return str((own.parent if own else Path.cwd()) / name)

    @work(thread=True, exit_on_error=False, group="sheet")
    def write_sheet(self, found: Workup, text: str | None, path: Path) -> None:
        """Figures and files, in a thread; one sentence at the end."""
        try:
            written(found, text, path)
            said, wrong = f"Written to {path}", False
        except FieldkitError as error:
            said, wrong = str(error), True
        except Exception as error:
            said, wrong = core.unexpected(error), True
        self.call_from_thread(self.say_progress, "")
        self.call_from_thread(self.tell, said, wrong=wrong)


def written(found: Workup, text: str | None, path: Path) -> None:
    """The sheet, or the bundle where the file is to be a zip; raises FieldkitError."""
    from fieldkit.sheet.basis import basis_of
    from fieldkit.sheet.bundle import check_bundle, write_bundle
    from fieldkit.sheet.compose import sheet
    from fieldkit.sheet.writing import check_target, write_sheet

    packed = path.suffix.lower() == ".zip"
    if packed:
        check_bundle(found.job, path)
    else:
        check_target(path)
    document = sheet(found, basis_of(found.job, text))
    if packed:
        write_bundle(found.job, document, path, text)
    else:
        write_sheet(document, path)
