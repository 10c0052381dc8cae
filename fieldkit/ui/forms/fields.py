"""Fields to type into, each judged while it is typed, with what there is to choose beside them."""

from __future__ import annotations

import asyncio
from collections.abc import Awaitable, Callable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass
from typing import ClassVar

from textual import events
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container, Horizontal, VerticalScroll
from textual.content import Content
from textual.message import Message
from textual.widgets import Input, OptionList, Static
from textual.widgets.option_list import Option

from fieldkit.ui.forms.codecs import Choice, checked
from fieldkit.ui.forms.offers import Offer, ranked
from fieldkit.ui.forms.tables import Field, Form
from fieldkit.ui.words import safe

Entered = Callable[["FieldRow", bool], Awaitable[None]]
LONGEST_WAIT_S = 5.0
CHOOSE = "type to narrow the list, ↓ and enter choose from it"


async def _nothing(_row: FieldRow, _chose: bool) -> None:
    """Enter means nothing until somebody says what."""


class FieldRow(Horizontal):
    """Label, input, and the value as it was understood."""

    def __init__(self, field: Field, place: tuple[str, ...], text: str, units: str) -> None:
        super().__init__(classes="field")
        self.field = field
        self.place = place
        self.first_text = text
        self.units = units
        self.error = ""
        self.implied = ""
        """What the other fields make of this one while it is empty."""

    def compose(self) -> ComposeResult:
        """The three parts."""
        star = "*" if self.field.needed else ""
        yield Static(f"{self.field.label}{star}", markup=False, classes="field-label")
        yield Input(self.first_text, compact=True, select_on_focus=False)
        yield Static("", markup=False, classes="field-says")

    def on_mount(self) -> None:
        """Judge what stood there already."""
        self.judge()

    @property
    def input(self) -> Input:
        """Where it is typed."""
        return self.query_one(Input)

    @property
    def text(self) -> str:
        """As typed, without blanks around it."""
        return self.input.value.strip()

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
            shown = self.when_empty
            self.error = f"{self.field.label} is needed" if self.field.needed else ""
        says = "✗ see below" if self.error else (f"✓ {shown}" if self.text else f"  {shown}")
        if self.error and not self.text:
            says = ""
        self.query_one(".field-says", Static).update(safe(says))
        self.set_class(bool(self.error) and bool(self.text), "-wrong")

    def lean(self, chosen: str) -> None:
        """Show what enter would take."""
        self.query_one(".field-says", Static).update(safe(f"→ {chosen}"))
        self.set_class(False, "-wrong")

    @property
    def when_empty(self) -> str:
        """What leaving it out means."""
        return self.implied or self.field.when_empty


class Choices(OptionList, can_focus=False):
    """What the field in hand offers; the keyboard stays in the field."""

    ROOM = 26
    """Columns where it has not been laid out yet."""

    @property
    def _room(self) -> int:
        """Columns of a line, beside the scroll bar."""
        stated = self.styles.width
        if stated is not None and stated.is_cells:
            return int(stated.value) - 2
        return (self.content_size.width or self.ROOM) - 1

    def show(self, offers: Sequence[Offer]) -> None:
        """Fill it, or hide it where nothing is offered."""
        room = self._room
        self.clear_options()
        self.add_options([Option(_line(offer, room), id=f"o{i}") for i, offer in enumerate(offers)])
        self.display = bool(offers)


def _line(offer: Offer, room: int) -> Content:
    """One line, cut where it is too long."""
    value = safe(offer.value)
    said = f"  {safe(offer.said)}" if offer.said else ""
    if len(value) + len(said) > room:
        said = f"{said[: max(0, room - len(value) - 1)]}…" if room > len(value) + 4 else ""
    return Content(value) + Content.styled(said, "$text-muted")


class Fields(Container):
    """The fields of a form; arrows walk among them, or among what the field in hand offers."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("down", "step(1)", "Next", show=False, priority=True, id="fields.next"),
        Binding("up", "step(-1)", "Before", show=False, priority=True, id="fields.before"),
        Binding("tab", "leave(1)", "Next", show=False, priority=True, id="fields.leave"),
        Binding("shift+tab", "leave(-1)", "Before", show=False, priority=True,
                id="fields.leave-back"),
        Binding("enter", "enter", "Take", show=False, priority=True, id="fields.enter"),
    ]  # fmt: skip
    """They are looked at before the field gets the key, so that fast typing keeps its order."""

    @dataclass
    class Explained(Message):
        """A sentence about the field in hand."""

        sentence: str
        wrong: bool

    class Typed(Message):
        """Something else stands in a field."""

    def __init__(
        self, form: Form, texts: Mapping[str, str], units: str, *, id: str | None = None
    ) -> None:
        super().__init__(id=id, classes="form-fields")
        self.form = form
        self.texts = texts
        self.units = units
        self.entered: Entered = _nothing
        """Told of enter in a field, and whether it took something from the list."""
        self._offers: list[Offer] = []
        self._offered_for = ""
        self._typed_here = False

    def compose(self) -> ComposeResult:
        """Fields, and the list of the one in hand."""
        with VerticalScroll(classes="fields", can_focus=False):
            for field in self.form.fields:
                yield self.row_for(field)
        yield Choices(classes="choices", compact=True)

    def row_for(self, field: Field) -> FieldRow:
        """The line of a field."""
        return FieldRow(
            field, self.form.place(field.key), self.texts.get(field.key, ""), self.units
        )

    def on_mount(self) -> None:
        """Nothing is offered before a field is in hand."""
        self.choices.display = False
        self._imply()

    @property
    def choices(self) -> Choices:
        """What is offered."""
        return self.query_one(Choices)

    @property
    def rows(self) -> list[FieldRow]:
        """The fields in order."""
        return list(self.query(FieldRow))

    def row(self, key: str) -> FieldRow:
        """The field of a key."""
        return next(row for row in self.rows if row.field.key == key)

    @property
    def values(self) -> dict[str, str]:
        """What stands in the fields, by key."""
        return {row.field.key: row.text for row in self.rows}

    @property
    def here(self) -> FieldRow | None:
        """The field that has the keyboard."""
        focused = self.screen.focused
        parent = focused.parent if focused is not None else None
        return parent if isinstance(parent, FieldRow) and parent in self.rows else None

    @property
    def first_wrong(self) -> FieldRow | None:
        """The first field that objects."""
        return next((row for row in self.rows if row.error), None)

    def put(self, texts: Mapping[str, str]) -> None:
        """Put other texts into the fields, and into the unnamed ones nothing."""
        for row in self.rows:
            row.first_text = texts.get(row.field.key, "")
            row.input.value = row.first_text
            row.input.cursor_position = len(row.first_text)
            row.judge()

    def on_input_changed(self, event: Input.Changed) -> None:
        """Judge while it is typed."""
        event.stop()
        row = event.input.parent
        if not isinstance(row, FieldRow) or not row.is_mounted:
            return
        self._typed_here = row is self.here
        row.judge()
        if row is self.here:
            self._offer(row)
            self.explain(row)
        self._imply()
        self.post_message(self.Typed())

    def _imply(self) -> None:
        """What the fields say of those that are empty."""
        for row in self.rows:
            if row.field.implied is not None:
                row.implied = row.field.implied(self.values)
                if not row.text:
                    row.judge()

    def on_descendant_focus(self, event: events.DescendantFocus) -> None:
        """Another field is in hand."""
        row = event.widget.parent
        if isinstance(row, FieldRow):
            self._typed_here = False
            row.scroll_visible(animate=False)
            self._offer(row)
            self.explain(row)

    def explain(self, row: FieldRow) -> None:
        """What is wrong with a field, or how to type it."""
        at = self.choices.highlighted
        if row.error and row.text and at is not None:
            chosen = self._offers[at].value
            row.lean(chosen)
            self.post_message(
                self.Explained(f"{row.field.label}: enter takes {chosen}, ↓ another", wrong=False)
            )
        elif row.error and row.text:
            self.post_message(self.Explained(f"✗ {row.error}", wrong=True))
        else:
            listed = row.field.offers is not None and isinstance(row.field.codec, Choice)
            hint = CHOOSE if listed else row.field.codec.hint
            hint = f"{row.field.label}: {hint}"
            self.post_message(self.Explained(hint, wrong=False))

    def _offer(self, row: FieldRow) -> None:
        self._offered_for = row.text
        offered = row.field.offers(self.values) if row.field.offers else ()
        exact = any(offer.value == row.text for offer in offered)
        self._offers = ranked(offered, "" if exact else row.text)
        self.choices.show(self._offers)
        if exact:
            values = [offer.value for offer in self._offers]
            self.choices.highlighted = values.index(row.text)
        elif row.error and row.text and self._offers:
            self.choices.highlighted = 0
        else:
            self.choices.highlighted = None

    @property
    def _choosing(self) -> bool:
        """Whether the arrows belong to the list and not to the fields."""
        row = self.here
        if row is None or not self._offers:
            return False
        exact = any(offer.value == row.text for offer in self._offers)
        if self.choices.highlighted is not None and not exact:
            return True
        return (row.field.needed and not row.text) or (self._typed_here and not exact)

    async def caught_up(self) -> None:
        """Wait until the field in hand holds every key that was pressed before this one."""
        row = self.here
        if row is None:
            return
        caught = asyncio.Event()
        row.input.call_later(caught.set)
        with suppress(TimeoutError):
            await asyncio.wait_for(caught.wait(), LONGEST_WAIT_S)
        if row.text != self._offered_for:
            row.judge()
            self._offer(row)

    async def action_step(self, step: int) -> None:
        """To another field, or through what is offered."""
        await self.caught_up()
        if not self._choosing:
            self._walk(step)
            return
        here = self.choices.highlighted
        last = len(self._offers) - 1
        there = (0 if step > 0 else -1) if here is None else here + step
        row = self.here
        if 0 <= there <= last:
            self.choices.highlighted = there
            if row is not None:
                row.lean(self._offers[there].value)
        else:
            self._walk(step)

    async def action_leave(self, step: int) -> None:
        """To another field, with what was chosen."""
        await self.caught_up()
        self._take_choice()
        self._walk(step)

    def _walk(self, step: int) -> None:
        (self.screen.focus_next if step > 0 else self.screen.focus_previous)()

    def _take_choice(self) -> bool:
        row, at = self.here, self.choices.highlighted
        if row is None or at is None or not 0 <= at < len(self._offers):
            return False
        chosen = self._offers[at].value
        if chosen == row.text:
            return False
        self._put_choice(row, chosen)
        return True

    def _put_choice(self, row: FieldRow, chosen: str) -> None:
        row.input.value = chosen
        row.input.cursor_position = len(chosen)
        row.judge()

    async def on_option_list_option_selected(self, event: OptionList.OptionSelected) -> None:
        """A click takes what it points at."""
        event.stop()
        row = self.here
        if row is not None and event.option_index < len(self._offers):
            self._put_choice(row, self._offers[event.option_index].value)
            await self.entered(row, True)

    async def action_enter(self) -> None:
        """Take what is chosen; what comes next the owner says."""
        await self.caught_up()
        if (row := self.here) is not None:
            await self.entered(row, self._take_choice())

    def focus_on(self, key: str) -> None:
        """Put the keyboard into a field."""
        self.screen.set_focus(self.row(key).input)
