"""The window that one row of a job is typed into, checked while it is typed."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.events import DescendantFocus
from textual.screen import ModalScreen
from textual.suggester import SuggestFromList
from textual.widgets import Input, Static

from fieldkit.ui.forms.codecs import Choice, checked
from fieldkit.ui.forms.tables import Field, Form
from fieldkit.ui.words import safe

Values = dict[str, str]
"""Changed keys with what was typed; an empty text takes a key out."""
Check = Callable[[Values], str]
"""Tries the values on the job; gives a sentence where they do not fit."""


class FieldRow(Horizontal):
    """Label, input, and the value as it was understood."""

    def __init__(self, field: Field, place: tuple[str, ...], text: str, units: str) -> None:
        super().__init__(classes="field")
        self.field = field
        self.place = place
        self.first_text = text
        self.units = units
        self.error = ""

    def compose(self) -> ComposeResult:
        """The three parts."""
        star = "*" if self.field.needed else ""
        codec = self.field.codec
        words = SuggestFromList(codec.options) if isinstance(codec, Choice) else None
        yield Static(f"{self.field.label}{star}", markup=False, classes="field-label")
        yield Input(self.first_text, compact=True, select_on_focus=False, suggester=words)
        yield Static("", markup=False, classes="field-says")

    def on_mount(self) -> None:
        """Judge what stood there already."""
        self.judge()

    @property
    def text(self) -> str:
        """As typed, without blanks around it."""
        return self.query_one(Input).value.strip()

    @property
    def changed(self) -> bool:
        """Whether it says something else than before."""
        return self.text != self.first_text.strip()

    def judge(self) -> None:
        """Say how the text is understood, or mark it."""
        shown = ""
        if self.text:
            shown, self.error = checked(self.field.codec, self.place, self.text, self.units)
        else:
            shown = self.field.when_empty
            self.error = f"{self.field.label} is needed" if self.field.needed else ""
        says = "✗ see below" if self.error else (f"✓ {shown}" if self.text else f"  {shown}")
        self.query_one(".field-says", Static).update(safe(says))
        self.set_class(bool(self.error), "-wrong")


class FormWindow(ModalScreen[Values | None]):
    """All fields of one row; enter takes them, escape leaves everything as it was."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Leave", id="form.leave"),
        Binding("ctrl+s", "take", "Take", id="form.take"),
        Binding("down", "app.focus_next", "Next", show=False, id="form.next"),
        Binding("up", "app.focus_previous", "Before", show=False, id="form.before"),
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

    def compose(self) -> ComposeResult:
        """Title, fields, the sentence about the field in hand, keys."""
        with Vertical(classes="window form-window"):
            yield Static(safe(self.heading), markup=False, classes="window-title")
            with VerticalScroll(classes="fields", can_focus=False):
                for field in self.form.fields:
                    text = self.texts.get(field.key, "")
                    yield FieldRow(field, self.form.place(field.key), text, self.units)
            yield Static("", markup=False, id="form-says")
            yield Static("↑↓ fields · enter takes all · esc leaves · * needed", classes="hint")

    @property
    def rows(self) -> list[FieldRow]:
        """The fields in order."""
        return list(self.query(FieldRow))

    def on_input_changed(self, event: Input.Changed) -> None:
        """Judge while it is typed."""
        row = event.input.parent
        if isinstance(row, FieldRow) and row.is_mounted:
            row.judge()
            self._explain(row)

    def on_descendant_focus(self, event: DescendantFocus) -> None:
        """Another field is in hand."""
        if isinstance(event.widget.parent, FieldRow):
            self._explain(event.widget.parent)

    def on_input_submitted(self, _event: Input.Submitted) -> None:
        """Enter takes the form."""
        self.action_take()

    def action_take(self) -> None:
        """Hand the values back, unless a field or the whole job objects."""
        wrong = next((row for row in self.rows if row.error), None)
        if wrong is not None:
            wrong.query_one(Input).focus()
            self._explain(wrong)
            return
        values = {row.field.key: row.text for row in self.rows if row.changed}
        objection = self.check(values) if values else ""
        if objection:
            self._say(f"✗ {objection}", wrong=True)
            return
        self.dismiss(values)

    def _explain(self, row: FieldRow) -> None:
        if row.error:
            self._say(f"✗ {row.error}", wrong=True)
        else:
            self._say(f"{row.field.label}: {row.field.codec.hint}", wrong=False)

    def _say(self, text: str, wrong: bool) -> None:
        says = self.query_one("#form-says", Static)
        says.update(safe(text))
        says.set_class(wrong, "-wrong")
