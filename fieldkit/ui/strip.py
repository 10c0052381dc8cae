"""The strip at the top: the job, what is being done, and how far each step has come."""

from __future__ import annotations

from time import monotonic

from textual.app import ComposeResult
from textual.containers import Horizontal, Vertical
from textual.content import Content
from textual.events import Click
from textual.message import Message
from textual.widgets import Static

from fieldkit.sheet.plain import percent
from fieldkit.ui.desk import STEPS, Desk, StepState, step_states
from fieldkit.ui.words import SIMULATED, safe, time_left


class Step(Static):
    """One step: its key and name above, its state below."""

    class Picked(Message):
        """The user clicked a step."""

        def __init__(self, step: str) -> None:
            self.step = step
            super().__init__()

    def __init__(self, number: int, step: str) -> None:
        super().__init__(id=f"step-{step}")
        self.step = step
        self.number = number
        self.state = StepState.TO_DO

    def show(self, state: StepState, here: bool) -> None:
        """State of the step, and whether its view is the one on screen."""
        self.state = state
        self.set_class(here, "-here")
        for other in StepState:
            self.set_class(other is state, f"-{other.name.lower().replace('_', '-')}")
        marker = "▌" if here else " "
        name = Content.styled(f"{self.number} {self.step.capitalize()}", "bold" if here else "")
        self.update(Content(f"{marker}") + name + Content(f"\n{marker}{state.glyph} {state.word}"))

    def on_click(self, _event: Click) -> None:
        """A click does what the number key does."""
        self.post_message(self.Picked(self.step))


def verdict(desk: Desk) -> str:
    """The answer in a few words, wherever one is; empty while there is none."""
    found = desk.workup.detuning if desk.workup else None
    if found is None or desk.job is None:
        return ""
    if found.chance_now >= desk.job.goal.chance:
        return f"  clear as it is, chance {percent(found.chance_now)} "
    if not found.fixes:
        return "  no change helps: see 5 "
    return f"  best change reaches {percent(found.fixes[0].chance)}: press 5 "


class Strip(Vertical):
    """Title line and the six steps."""

    begun_s: float | None = None
    """When what is being done began; None while nothing is."""

    def compose(self) -> ComposeResult:
        """Title and activity on one line, the steps below."""
        with Horizontal(id="title-line"):
            yield Static(id="job-title", markup=False)
            yield Static(id="activity", markup=False)
        with Horizontal(id="steps"):
            for number, step in enumerate(STEPS, start=1):
                yield Step(number, step)

    def show(self, desk: Desk, here: str, unsaved: bool) -> None:
        """Everything at once."""
        title = desk.job.title if desk.job else "no job open"
        mark = "  * unsaved" if unsaved else ""
        origin = f"  {SIMULATED}" if desk.simulated else ""
        self.set_class(bool(origin), "-simulated")
        line = f" fieldkit{origin}  {title}{mark}"
        self.query_one("#job-title", Static).update(Content(safe(line)))
        if not desk.working:
            self.query_one("#activity", Static).update(Content(safe(verdict(desk))))
        for step, state in step_states(desk).items():
            self.query_one(f"#step-{step}", Step).show(state, step == here)

    def say(self, doing: str, fraction: float | None) -> None:
        """What is being done now; an empty text clears it."""
        now_s = monotonic()
        if not doing or self.begun_s is None:
            self.begun_s = now_s if doing else None
        share = f" {fraction:4.0%}" if fraction is not None else ""
        left = time_left(now_s - (self.begun_s or now_s), fraction or 0.0)
        words = ", ".join(part for part in (f"{doing}{share}", left) if part)
        text = f"  ▸ {words}  esc stops " if doing else ""
        self.query_one("#activity", Static).update(Content(safe(text)))
