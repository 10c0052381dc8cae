"""Changing the job: forms, new and removed rows, adopted fixes, and the way back.

The forms are loaded when the first one is asked for: the first paint does not wait for them.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

from textual import work

from fieldkit.errors import FieldkitError
from fieldkit.job import journal
from fieldkit.ui import messages as say
from fieldkit.ui.dialogs import AskScreen, PickScreen
from fieldkit.ui.document import OpenJob
from fieldkit.ui.files import Files

if TYPE_CHECKING:
    from fieldkit.job.draft import Draft
    from fieldkit.job.journal import Kept
    from fieldkit.job.store import JobText
    from fieldkit.ui.forms import Form, Values
    from fieldkit.workup import Workup

ADDABLE = (
    ("support", "Support"),
    ("mass", "Mass: valve, flange, actuator"),
    ("leg", "Leg: a straight run after a bend"),
    ("excitation", "Excitation: a machine or a frequency"),
    ("measured", "Peak read elsewhere"),
    ("recording", "Recording"),
)
REMOVE = (("remove", "Remove"), ("back", "Back"))
ADOPT = (
    ("aside", "Adopt, taps aside"),
    ("keep", "Adopt, keep taps"),
    ("back", "Back"),
)


class Editing(Files):
    """The app's dealings with the text of the job."""

    async def on_edit_wanted(self, message: say.EditWanted) -> None:
        """One row in a form."""
        self.edit_row(message.table, message.index)

    async def on_add_wanted(self, message: say.AddWanted) -> None:
        """A new row in a form."""
        self.add_row(message.table, message.preset)

    async def on_remove_wanted(self, message: say.RemoveWanted) -> None:
        """One row out."""
        self.remove_row(message.table, message.index)

    async def on_adopt_wanted(self, message: say.AdoptWanted) -> None:
        """A fix into the job."""
        self.adopt(message)

    @work
    async def edit_row(
        self, table: str, index: int | None, typed: Mapping[str, str] | None = None
    ) -> None:
        """Change one row; ``typed`` is what stood in the form when it was left behind."""
        from fieldkit.ui import forms

        text, form = self.desk.text, forms.FORMS[table]
        if text is None:
            return
        texts = forms.texts_of(text, form, index)
        values = await self._ask(form, forms.row_label(form, index), texts, index, typed)
        if values:
            self.change_text(lambda: forms.with_values(text, form, index, values))

    @work
    async def add_row(
        self, table: str, preset: dict[str, str], typed: Mapping[str, str] | None = None
    ) -> None:
        """Add one row, asking of what kind where that is not said."""
        from fieldkit.ui import forms

        text = self.desk.text
        if text is None:
            return
        if not table:
            picked = await self.push_screen_wait(PickScreen("Add what?", ADDABLE))
            table = picked or ""
        if not table:
            return
        if table == "recording" and not preset.get("file") and typed is None:
            file = await self._pick_recording()
            if file is None:
                return
            preset = {**preset, "file": file}
        form = forms.FORMS[table]
        values = await self._ask(form, f"New {form.title.lower()}", preset, -1, typed)
        if values:
            self.change_text(lambda: forms.with_values(text, form, -1, values))

    async def _pick_recording(self) -> str | None:
        """A recording as the job file names it: by its path from there."""
        from fieldkit.ui.start.picker import FilePicker
        from fieldkit.ui.start.standing import RECORDING_SUFFIXES, about_recording

        path = self.open_job.path if self.open_job else None
        here = path.parent.absolute() if path else Path.cwd()
        picker = FilePicker(
            "Add which recording?", here, RECORDING_SUFFIXES, about_recording, what="recording"
        )
        picked = await self.push_screen_wait(picker)
        if picked is None:
            return None
        try:
            return picked.absolute().relative_to(here).as_posix()
        except ValueError:
            return str(picked.absolute())

    async def _ask(
        self,
        form: Form,
        title: str,
        texts: Mapping[str, str],
        index: int | None,
        typed: Mapping[str, str] | None = None,
    ) -> Values | None:
        from fieldkit.ui import forms

        text = self.desk.text
        assert text is not None
        start = dict(texts) if index is not None and index < 0 else {}

        def objection(values: Values) -> str:
            try:
                forms.with_values(text, form, index, start | values).job()
            except FieldkitError as error:
                return str(error)
            return ""

        window = forms.FormWindow(form, title, texts, self.desk.units, objection)
        window.typed = dict(typed or {})
        window.on_typed = lambda values: self.keep_typing(
            {"table": form.table, "index": index, "texts": dict(texts), "values": values}
        )
        values = await self.push_screen_wait(window)
        self.typing = {}
        if values is None:
            self.keep_typing({})
            return None
        return start | values

    def reopen_form(self, typing: Mapping[str, Any]) -> None:
        """Go on with a form that was open when the program ended."""
        from fieldkit.ui.forms import FORMS

        table, index = str(typing.get("table", "")), typing.get("index")
        values = {str(key): str(text) for key, text in dict(typing.get("values", {})).items()}
        if table not in FORMS or not values:
            return
        self.action_view("span")
        if isinstance(index, int) and index < 0:
            self.add_row(table, dict(typing.get("texts", {})), values)
        else:
            self.edit_row(table, index, values)

    @work
    async def remove_row(self, table: str, index: int) -> None:
        """Take one row out, after asking."""
        from fieldkit.ui import forms

        text = self.desk.text
        if text is None:
            return
        what = forms.row_label(forms.FORMS[table], index).lower()
        question = f"Remove {what}? (u takes it back)"
        if await self.push_screen_wait(AskScreen(question, REMOVE)) == "remove":
            self.change_text(lambda: text.without(table, index))

    @work
    async def adopt(self, message: say.AdoptWanted) -> None:
        """Write a fix into the job, after asking."""
        from fieldkit.ui import forms

        text, verdict = self.desk.text, message.verdict
        if text is None:
            return
        which = f"change {verdict.rank}" if verdict.rank else "this change"
        question = (
            f"Adopt {which} into the job?\n\n{verdict.summary}\n\n"
            "The description then shows the pipe as it will be. The taps are of the pipe as it "
            "was: set them aside, build the change, tap again. Save under another name (S) to "
            "keep both; u takes it back."
        )
        answer = await self.push_screen_wait(AskScreen(question, ADOPT))
        if answer == "aside":
            self.change_text(lambda: forms.without_taps(text).with_change(verdict.change))
        elif answer == "keep":
            self.change_text(lambda: text.with_change(verdict.change))

    def action_undo(self) -> None:
        """Take the last change back."""
        opened = self.open_job
        if opened is None or not opened.past:
            self.tell("There is nothing to take back.")
            return
        self._step_to(opened.undone(), f"Taken back: {self._label(opened.past[-1], opened.text)}")

    def action_redo(self) -> None:
        """Make the change again that was taken back last."""
        opened = self.open_job
        if opened is None or not opened.future:
            self.tell("There is nothing to make again.")
            return
        self._step_to(opened.redone(), f"Again: {self._label(opened.text, opened.future[0])}")

    def _step_to(self, opened: OpenJob, told: str) -> None:
        try:
            job = opened.text.job()
        except FieldkitError as error:
            self.tell(str(error), wrong=True)
            return
        self.take(opened, job)
        self.tell(told)

    def _label(self, before: JobText, after: JobText) -> str:
        from fieldkit.job.changes import change_label

        return change_label(before, after)

    def action_units(self) -> None:
        """Show everything in the other system of units; what was typed stays as it was."""
        opened = self.open_job
        if opened is None:
            self.tell("There is no job yet.")
            return
        other = "SI" if self.desk.units == "US" else "US"
        if self.change_text(lambda: opened.text.with_value("units", other)):
            self.put(workup=in_units(self.desk.workup, other))
            self.tell(f"Shown in {other} units; quantities may be typed in any.")

    @work
    async def action_new(self) -> None:
        """Describe a new pipe, step by step."""
        if await self.may_go_on():
            await self.describe_new()

    async def describe_new(self) -> bool:
        """The guided path from the start."""
        from fieldkit.job.draft import Draft

        return await self.describe(Draft(), journal.key_of(None))

    async def take_up(self, kept: Kept) -> bool:
        """Go on with a job that was never saved, or with its description."""
        from fieldkit.job.draft import draft_from
        from fieldkit.job.store import JobText

        try:
            if kept.draft:
                return await self.describe(draft_from(kept.draft), kept.key)
            text = JobText(kept.text)
            job = text.job()
        except (FieldkitError, TypeError, KeyError, ValueError) as error:
            self.tell(f"What was kept cannot be read: {error}", wrong=True)
            return False
        self.begin(OpenJob(text, None), job)
        journal.drop(kept.key)
        if kept.typing:
            self.reopen_form(kept.typing)
        return True

    async def describe(self, draft: Draft, key: str) -> bool:
        """The guided path from a draft; True once a job lies on the desk."""
        from fieldkit.job.draft import Draft
        from fieldkit.job.store import JobText
        from fieldkit.ui.start.guided import GuidedScreen

        def keep(answers: Draft) -> None:
            if answers == Draft():
                journal.drop(key)
            else:
                self.keep_draft(key, answers)

        done = await self.push_screen_wait(GuidedScreen(draft, Path.cwd(), keep))
        if done is None:
            return False
        text = JobText(done.text)
        self.begin(OpenJob(text, None), text.job())
        self.action_view("span")
        journal.drop(key)
        if done.path is not None:
            self._written(done.path)
        return True


def in_units(found: Workup | None, units: str) -> Workup | None:
    """Results worded in other units; what is worded deeper inside follows with the next work."""
    if found is None:
        return None
    from fieldkit.detune.wording import summary

    job, detuning = replace(found.job, units=units), found.detuning
    if detuning is not None:
        fixes = tuple(
            replace(fix, summary=summary(fix.change, job.span, units)) for fix in detuning.fixes
        )
        detuning = replace(detuning, fixes=fixes)
    return replace(found, job=job, detuning=detuning)
