"""The job file in the user's own editor, and what is wrong in it at its line."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from textual import work
from textual.app import SuspendNotSupported

from fieldkit.errors import FieldkitError, InputError
from fieldkit.ui.document import OpenJob
from fieldkit.ui.editing import Editing

if TYPE_CHECKING:
    from fieldkit.job.document import Job
    from fieldkit.job.store import JobText

UNCHANGED = (
    "Nothing was changed. An editor with a window of its own must wait: EDITOR='code --wait'."
)


class TextEditing(Editing):
    """The app's dealings with the text of the job as a whole."""

    @work(exclusive=True, group="edit-text")
    async def action_edit_text(self) -> None:
        """Edit the job file in the user's editor; what comes back is checked and can be undone."""
        opened = self.open_job
        if opened is None:
            self.tell("There is no job to edit.")
            return
        await self._edit_from(opened, opened.text)

    async def _edit_from(
        self, opened: OpenJob, start: JobText, error: FieldkitError | None = None
    ) -> None:
        found = await self.edited_text(start, error)
        self.typing = {}
        if found is None:
            self.keep_typing({})
        else:
            self.take(opened.edited(found[0]), found[1])
            self.tell("The file as edited; not saved yet: ctrl+s saves it, u takes it back.")

    def reopen_form(self, typing: Mapping[str, Any]) -> None:
        """Go on with a form, or with a text that was not in order yet."""
        if typing.get("table") == "text":
            self.reopen_text(str(typing.get("text", "")))
        else:
            super().reopen_form(typing)

    @work(exclusive=True, group="edit-text")
    async def reopen_text(self, typed: str) -> None:
        """Show what is wrong in the text that was left behind."""
        opened = self.open_job
        if opened is None:
            return
        text = replace(opened.text, text=typed)
        try:
            job = text.job()
        except FieldkitError as error:
            await self._edit_from(opened, text, error)
            return
        self.take(opened.edited(text), job)

    async def edited_text(
        self, start: JobText, error: FieldkitError | None = None
    ) -> tuple[JobText, Job] | None:
        """The text as the user leaves it, once it holds together; None where it was given up."""
        from fieldkit.ui.broken_screen import BrokenScreen, line_of

        text = start
        while True:
            if error is not None:
                window = BrokenScreen(str(start.path or _name(start)), error, text.text, "Leave it")
                if await self.push_screen_wait(window) != "edit":
                    return None
            changed = self._in_editor(text, line_of(error) if error else None)
            if changed is None:
                return None
            if changed.text == start.text and error is None:
                self.tell(UNCHANGED)
                return None
            try:
                return changed, changed.job()
            except FieldkitError as fault:
                text, error = changed, fault
                self.keep_typing({"table": "text", "text": changed.text})

    def _in_editor(self, text: JobText, line: int | None) -> JobText | None:
        """What the editor leaves; None, and a sentence, where it cannot be started."""
        from fieldkit.ui.own_editor import edited, editor_command

        try:
            editor_command()
            with self.suspend():
                changed = edited(text.text, _name(text), line)
        except SuspendNotSupported:
            self.tell("This terminal cannot be handed to an editor.", wrong=True)
            return None
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return None
        self.refresh(layout=True)
        return replace(text, text=changed)

    async def mended(self, path: Path) -> bool:
        """Show where a job file is wrong; what the user mends lies on the desk, unsaved."""
        from fieldkit.job.store import load_text

        try:
            text = load_text(path)
            job = text.job()
        except InputError as error:
            found = await self._mended_text(path, error)
            if found is None:
                return False
            text, job = found
            self.begin(OpenJob(text, replace(text, text="")), job)
            self.tell("Mended; not saved yet: ctrl+s saves it.")
            return True
        self.begin(OpenJob(text, text), job)
        return True

    async def _mended_text(self, path: Path, error: InputError) -> tuple[JobText, Job] | None:
        from fieldkit.job.store import load_text

        try:
            text = load_text(path)
        except InputError as unreadable:
            self.tell(str(unreadable), wrong=True)
            return None
        return await self.edited_text(text, error)


def _name(text: JobText) -> str:
    return text.path.name if text.path else "job.toml"
