"""A new job, step by step: pipe, legs, supports, masses, excitation, goal, drawn as it is typed."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.content import Content
from textual.events import Click
from textual.screen import Screen
from textual.widgets import Button, ContentSwitcher, Static

from fieldkit.errors import FieldkitError, InputError
from fieldkit.job.draft import Draft, draft_text, job_of, span_of
from fieldkit.quantity import show
from fieldkit.ui.dialogs import AskScreen
from fieldkit.ui.start.step_pane import StepPane
from fieldkit.ui.start.steps import goal_file, steps_for
from fieldkit.ui.units import length
from fieldkit.ui.widgets import SpanDrawing
from fieldkit.ui.words import safe

if TYPE_CHECKING:
    from fieldkit.span.layout import Span

LEAVE = (
    ("keep", "Keep it for later"),
    ("discard", "Throw it away"),
    ("back", "Go on describing"),
)
HINT = "enter · pgdn next · pgup back · ^d removes · esc leaves"


@dataclass(frozen=True)
class Described:
    """What the guided path ends with."""

    draft: Draft
    text: str
    """The job file."""
    path: Path | None
    """Where it is to be saved; None for nowhere yet."""


class StepName(Static):
    """One step in the line at the top."""

    def __init__(self, number: int) -> None:
        super().__init__(markup=False, classes="guide-step")
        self.number = number

    async def on_click(self, _event: Click) -> None:
        """Go there."""
        if isinstance(self.screen, GuidedScreen):
            await self.screen.go_to(self.number)


class GuidedScreen(Screen[Described | None]):
    """Six short steps; going back loses nothing, and leaving asks."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "leave", "Leave", id="guided.leave"),
        Binding("pagedown,ctrl+n", "next", "Next step", priority=True, id="guided.next"),
        Binding("pageup,ctrl+r", "before", "Step back", priority=True, id="guided.back"),
        Binding("f3", "turn", "Another side", show=False, id="guided.turn"),
    ]

    def __init__(
        self, draft: Draft, folder: Path, on_draft: Callable[[Draft], None] | None = None
    ) -> None:
        """``on_draft`` is told of every key press."""
        super().__init__()
        self.draft = draft
        self.folder = folder
        self.on_draft = on_draft or (lambda _draft: None)
        self.steps = steps_for(draft)
        """The path, with choices that follow from the answers when a step was opened."""

    def compose(self) -> ComposeResult:
        """Steps, the step in hand, the drawing, buttons."""
        yield Static("", markup=False, id="guide-title")
        with Horizontal(id="guide-steps"):
            for number in range(len(self.steps)):
                yield StepName(number)
        yield ContentSwitcher(id="guide-panes")
        yield SpanDrawing(id="guide-drawing")
        with Horizontal(id="guide-buttons"):
            yield Button(Content("‹ Back"), id="guide-back", compact=True)
            yield Button(Content("Next ›"), id="guide-next", compact=True)
            yield Static(HINT, markup=False, classes="hint")

    async def on_mount(self) -> None:
        """The step it was left at."""
        self.query_one(SpanDrawing).can_focus = False
        for button in self.query(Button):
            button.can_focus = False
        await self._show(self.draft.step)

    @property
    def pane(self) -> StepPane | None:
        """The step in hand."""
        table = self.steps[self.draft.step].table
        found = self.query(f"#pane-{table}")
        return found.first(StepPane) if found else None

    async def _show(self, number: int) -> None:
        self.draft = replace(self.draft, step=number)
        self.steps = steps_for(self.draft)
        step = self.steps[number]
        if step.table == "goal" and not self.draft.goal.get("file"):
            goal = {**self.draft.goal, "file": goal_file(self.draft, self.folder)}
            self.draft = replace(self.draft, goal=goal)
        switcher = self.query_one("#guide-panes", ContentSwitcher)
        for old in self.query(f"#pane-{step.table}"):
            await old.remove()
        pane = StepPane(step, self.draft, self._objection)
        pane.done = self.action_next
        await switcher.add_content(pane, id=pane.id, set_current=True)
        pane.start()
        self._tell()

    def _objection(self, table: str, rows: tuple[Mapping[str, str], ...]) -> str:
        draft = self.draft
        if table in ("pipe", "goal"):
            draft = draft.with_answers(table, rows[0])
        else:
            draft = draft.with_rows(table, rows)
        try:
            job_of(draft)
        except InputError as error:
            return f"{error.what}; {error.remedy}" if error.remedy else error.what
        return ""

    def on_step_pane_changed(self, message: StepPane.Changed) -> None:
        """Keep it and draw it."""
        message.stop()
        self._collect()
        self._tell()

    def _collect(self) -> None:
        pane = self.pane
        if pane is None:
            return
        table, draft = pane.step.table, self.draft
        if pane.step.repeated:
            draft = replace(
                draft.with_rows(table, tuple(pane.rows)),
                half={**draft.half, table: pane.values},
                at={**draft.at, table: pane.at},
            )
        else:
            draft = draft.with_answers(table, pane.values)
        if draft != self.draft:
            self.draft = draft
            self.on_draft(draft)

    def _tell(self) -> None:
        title = f" New job: {self.draft.title}" if self.draft.pipe.get("title") else " New job"
        self.query_one("#guide-title", Static).update(Content(safe(title)))
        for name in self.query(StepName):
            name.update(self._step_name(name.number))
            name.set_class(name.number == self.draft.step, "-here")
        self.query_one("#guide-back", Button).disabled = self.draft.step == 0
        last = self.draft.step == len(self.steps) - 1
        self.query_one("#guide-next", Button).label = Content("Open it ›" if last else "Next ›")
        self._draw()

    def _step_name(self, number: int) -> Content:
        step, here = self.steps[number], number == self.draft.step
        count = len(self.draft.of(step.table))
        if number < self.draft.step or (step.repeated and count):
            mark = f" {count}" if step.repeated else " ✓"
        else:
            mark = ""
        text = f"{'▌' if here else ' '}{number + 1} {step.title}{mark}"
        return Content.styled(text, "bold" if here else "")

    def _draw(self) -> None:
        span = self._span()
        units = self.draft.units
        self.query_one(SpanDrawing).show(
            span,
            length_text=lambda at_m: length(at_m, units),
            mass_text=lambda mass_kg: show(mass_kg, "mass", units),
        )

    def _span(self) -> Span | None:
        """With the row in hand where that makes sense already, else without it."""
        table = self.steps[self.draft.step].table
        for draft in (self.draft.with_half(table), self.draft):
            try:
                return span_of(draft)
            except FieldkitError:
                continue
        return None

    async def on_button_pressed(self, event: Button.Pressed) -> None:
        """What the keys do."""
        event.stop()
        await (self.action_next if event.button.id == "guide-next" else self.action_before)()

    async def action_next(self) -> None:
        """The next step, or the end, once this one holds together."""
        await self.go_to(self.draft.step + 1)

    async def action_before(self) -> None:
        """One step back; what is half typed waits there."""
        await self.go_to(max(0, self.draft.step - 1))

    def action_turn(self) -> None:
        """See the drawing from another side."""
        self.query_one(SpanDrawing).action_turn()

    async def go_to(self, number: int) -> None:
        """To a step; forward one by one, as far as the answers carry.

        Keys that are pressed meanwhile wait, and then go to the new step.
        """
        if self.pane is not None:
            await self.pane.fields.caught_up()
        while self.draft.step < number:
            pane = self.pane
            if pane is None or not pane.settled():
                return
            self._collect()
            if self.draft.step + 1 == len(self.steps):
                self._finish()
                return
            await self._show(self.draft.step + 1)
        if number < self.draft.step:
            self._collect()
            await self._show(number)
        self.on_draft(self.draft)

    def _finish(self) -> None:
        """The whole job, as a file."""
        try:
            job_of(self.draft)
            text = draft_text(self.draft)
        except FieldkitError as error:
            if self.pane is not None:
                self.pane.say(f"✗ {error}", wrong=True)
            return
        file = self.draft.goal.get("file", "").strip()
        self.dismiss(Described(self.draft, text, Path(file).expanduser() if file else None))

    @work(exclusive=True, group="guide")
    async def action_leave(self) -> None:
        """Ask what becomes of it; nothing is lost by asking."""
        self._collect()
        if self.draft == Draft():
            self.dismiss(None)
            return
        question = "Leave this description?\n\nKept for later, the start screen offers it again."
        answer = await self.app.push_screen_wait(AskScreen(question, LEAVE))
        if answer == "discard":
            self.on_draft(Draft())
        if answer in ("keep", "discard"):
            self.dismiss(None)
