"""The window that one row of a job is typed into, checked while it is typed."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.screen import ModalScreen
from textual.widgets import Button, Static

from fieldkit.ui.dialogs import key_button
from fieldkit.ui.forms.fields import FieldRow, Fields
from fieldkit.ui.forms.tables import Form
from fieldkit.ui.words import safe

__all__ = ["FieldRow", "FormWindow", "Values"]

Values = dict[str, str]
"""Changed keys with what was typed; an empty text takes a key out."""
Check = Callable[[Values], str]
"""Tries the values on the job; gives a sentence where they do not fit."""


class FormWindow(ModalScreen[Values | None]):
    """All fields of one row; enter takes them, escape leaves everything as it was."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Leave", id="form.leave"),
        Binding("ctrl+s", "take", "Take", priority=True, id="form.take"),
    ]

    def __init__(
        self, form: Form, title: str, texts: Mapping[str, str], units: str, check: Check
    ) -> None:
        """``texts``: what stands in the file, by key; ``check`` tries changed values on the job."""
        super().__init__()
        self.form = form
        self.heading = title
        self.texts = texts
        self.units = units
        self.check = check
        self.on_typed: Callable[[Values], None] = lambda _values: None
        """Told of every key press."""
        self.typed: Values = {}
        """What was typed into it when it was left behind."""

    def compose(self) -> ComposeResult:
        """Title, fields, the sentence about the field in hand, keys."""
        with Vertical(classes="window form-window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            yield Fields(self.form, self.texts, self.units)
            yield Static("", markup=False, id="form-says")
            with Horizontal(classes="keys"):
                yield key_button("take", "Take all")
                yield key_button("leave", "Leave")
                yield Static("↑↓ fields · enter takes all · esc leaves · * needed", classes="hint")

    def on_mount(self) -> None:
        """Start in the first field, or go on with what was typed before."""
        self.fields.entered = self.entered
        rows = self.fields.rows
        for row in rows:
            if row.field.key in self.typed:
                row.input.value = self.typed[row.field.key]
        self.set_focus(rows[0].input)

    @property
    def fields(self) -> Fields:
        """What is typed into."""
        return self.query_one(Fields)

    @property
    def changed(self) -> Values:
        """What was typed anew, by key."""
        return {row.field.key: row.text for row in self.fields.rows if row.changed}

    def on_fields_typed(self, _message: Fields.Typed) -> None:
        """Let who wants to keep it."""
        self.on_typed(self.changed)

    def on_fields_explained(self, message: Fields.Explained) -> None:
        """The field in hand has something to say."""
        self._say(message.sentence, message.wrong)

    async def entered(self, _row: FieldRow, chose: bool) -> None:
        """Enter takes the form, or first what was chosen from a list."""
        if chose:
            self.focus_next()
        else:
            await self.action_take()

    async def on_button_pressed(self, event: Button.Pressed) -> None:
        """What enter and escape do."""
        if event.button.id == "take":
            await self.action_take()
        else:
            self.dismiss(None)

    async def action_take(self) -> None:
        """Hand the values back, unless a field or the whole job objects."""
        await self.fields.caught_up()
        wrong = self.fields.first_wrong
        if wrong is not None:
            self.set_focus(wrong.input)
            self._say(f"✗ {wrong.error}", wrong=True)
            return
        values = self.changed
        objection = self.check(values) if values else ""
        if objection:
            self._say(f"✗ {objection}", wrong=True)
            return
        self.dismiss(values)

    def _say(self, text: str, wrong: bool) -> None:
        says = self.query_one("#form-says", Static)
        says.update(safe(text))
        says.set_class(wrong, "-wrong")
