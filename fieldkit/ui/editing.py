"""Changing the job: forms, new and removed rows, adopted fixes, and the way back.

The forms are loaded when the first one is asked for: the first paint does not wait for them.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from textual import work

from fieldkit.errors import FieldkitError
from fieldkit.ui import messages as say
from fieldkit.ui.dialogs import AskScreen, PickScreen
from fieldkit.ui.document import OpenJob
from fieldkit.ui.files import Files

if TYPE_CHECKING:
    from fieldkit.ui.forms import Form, Values

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
    async def edit_row(self, table: str, index: int | None) -> None:
        """Change one row."""
        from fieldkit.ui import forms

        text, form = self.desk.text, forms.FORMS[table]
        if text is None:
            return
        texts = forms.texts_of(text, form, index)
        values = await self._ask(form, forms.row_label(form, index), texts, index)
        if values:
            self.change_text(lambda: forms.with_values(text, form, index, values))

    @work
    async def add_row(self, table: str, preset: dict[str, str]) -> None:
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
        form = forms.FORMS[table]
        values = await self._ask(form, f"New {form.title.lower()}", preset, -1)
        if values:
            self.change_text(lambda: forms.with_values(text, form, -1, values))

    async def _ask(
        self, form: Form, title: str, texts: dict[str, str], index: int | None
    ) -> Values | None:
        from fieldkit.ui import forms

        text = self.desk.text
        assert text is not None

        def objection(values: Values) -> str:
            try:
                forms.with_values(text, form, index, values).job()
            except FieldkitError as error:
                return str(error)
            return ""

        return await self.push_screen_wait(
            forms.FormWindow(form, title, texts, self.desk.units, objection)
        )

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
        which = f"change {verdict.rank}" if verdict.rank else "the change from the map"
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
        if self.open_job is None or not self.open_job.past:
            self.tell("There is nothing to take back.")
            return
        before = self.open_job.undone()
        self.take(before, before.text.job())

    @work
    async def action_new(self) -> None:
        """Start from an empty description."""
        from fieldkit.job.store import new_job_text

        if await self.may_go_on():
            text = new_job_text()
            self.begin(OpenJob(text, None), text.job())
            self.action_view("span")
