"""The app: global keys, the six views, the strip above and the ruler below."""

from __future__ import annotations

from collections.abc import Awaitable, Callable, Iterable
from pathlib import Path, PurePath
from typing import ClassVar

from textual.app import ComposeResult, SystemCommand
from textual.binding import Binding, BindingType
from textual.screen import Screen
from textual.widgets import ContentSwitcher, Footer, Static

from fieldkit.ui import looks
from fieldkit.ui.commands import COMMANDS, help_text
from fieldkit.ui.desk import STEPS
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.measuring import Measuring
from fieldkit.ui.plots import shaded
from fieldkit.ui.readings import reading
from fieldkit.ui.strip import Step, Strip
from fieldkit.ui.views.base import View, plain
from fieldkit.ui.views.tap import TapView
from fieldkit.ui.widgets import FrequencyRuler, RulerData
from fieldkit.ui.words import safe


def _view_keys() -> list[BindingType]:
    return [
        Binding(str(number), f"view('{step}')", step.capitalize(), show=False, id=f"view.{step}",
                tooltip=f"Go to {step.capitalize()}")
        for number, step in enumerate(STEPS, start=1)
    ]  # fmt: skip


class FieldkitApp(Measuring):
    """Six views in the order of the work, over one job."""

    TITLE = "fieldkit"
    CSS_PATH: ClassVar[list[str | PurePath]] = [
        Path(__file__).with_name("app.tcss"),
        Path(__file__).parent / "start" / "start.tcss",
    ]
    HORIZONTAL_BREAKPOINTS = [(0, "-narrow"), (100, "-wide")]  # noqa: RUF012
    VERTICAL_BREAKPOINTS = [(0, "-short"), (34, "-tall")]  # noqa: RUF012
    BINDINGS: ClassVar[list[BindingType]] = [
        *_view_keys(),
        Binding("ctrl+s", "save", "Save", id="file.save", tooltip="Write the job file"),
        Binding("S", "save_as", "Save as", show=False, id="file.save-as",
                tooltip="Write the job under another name"),
        Binding("o", "open", "Open", show=False, id="file.open", tooltip="Open a job file"),
        Binding("n", "new", "New", show=False, id="file.new",
                tooltip="Describe a new pipe, step by step"),
        Binding("s", "sample", "Sample", show=False, id="file.sample",
                tooltip="Copy the sample jobs out and open one"),
        Binding("m", "measure('tap')", "Measure", show=False, id="capture.tap",
                tooltip="Guided tap test with an input or the practice rig"),
        Binding("u,ctrl+z", "undo", "Undo", show=False, id="edit.undo",
                tooltip="Take the last change of the job back"),
        Binding("U,ctrl+y", "redo", "Redo", show=False, id="edit.redo",
                tooltip="Make the change again that was taken back"),
        Binding("E", "edit_text", "Edit file", show=False, id="edit.text",
                tooltip="Edit the job file in your own editor"),
        Binding("y", "units", "SI/US", show=False, id="look.units",
                tooltip="Show everything in SI or in US units"),
        Binding("r", "rerun", "Rework", show=False, id="work.again",
                tooltip="Work the whole job out again"),
        Binding("escape", "stop", "Stop", show=False, priority=True, id="work.stop",
                tooltip="Stop what is being worked out"),
        Binding("t", "toggle_light", "Colours", show=False, id="look.light",
                tooltip="Dark, light, high contrast, or no colour at all"),
        Binding("Y", "copy_view", "Copy", show=False, id="look.copy",
                tooltip="The view as plain text, and on the clipboard"),
        Binding("H", "how", "How", show=False, id="help.how",
                tooltip="How the numbers of this view are computed, with sources"),
        Binding("question_mark", "help", "Keys", key_display="?", id="help.keys",
                tooltip="List every key"),
        Binding("q,ctrl+q", "quit", "Quit", key_display="q", id="app.quit",
                tooltip="Leave; asks first when something is unsaved"),
    ]  # fmt: skip

    def __init__(self, job_path: Path | None = None) -> None:
        super().__init__()
        looks.prepare(self)
        self.job_path = job_path
        self.here = STEPS[0]
        self.ready = False
        """Whether all six views are there; a number key pressed before is remembered."""

    def compose(self) -> ComposeResult:
        """Strip, the first view, ruler, reading, keys; the other views come after the paint."""
        yield Strip()
        with ContentSwitcher(initial=self.here, id="views"):
            yield TapView()
        yield FrequencyRuler(id="ruler")
        yield plain("reading")
        yield Footer(compact=True, show_command_palette=False)

    def on_mount(self) -> None:
        """First paint, then the job: nothing slow may come before."""
        self.refresh_desk()
        if self.job_path is None:
            self.welcome()
        self.call_after_refresh(self.go_on)

    async def go_on(self) -> None:
        """The other views, then the job."""
        from fieldkit.ui.views.order import VIEWS

        switcher = self.base.query_one("#views", ContentSwitcher)
        for view in VIEWS[1:]:
            await switcher.add_content(view(), id=view.NAME)
        self.ready = True
        self.action_view(self.here)
        self.open_or_ask()

    def open_or_ask(self) -> None:
        """Open the job that was named; without one the start screen is there already."""
        if self.job_path is not None:
            self.say_progress("opening")
            self.read_job(self.job_path)
            return
        self.warm_libraries()

    def view(self, name: str) -> View:
        """One of the six."""
        return self.base.query_one(f"#{name}", View)

    @property
    def base(self) -> Screen[object]:
        """The screen under every window."""
        return self.screen_stack[0]

    def refresh_desk(self) -> None:
        """Hand the desk to the strip, the view on screen, the ruler and the reading."""
        if not self.is_running or not self.screen_stack:
            return  # a thread's last word while the app closes
        base = self.base
        unsaved = self.open_job is not None and self.open_job.unsaved
        base.query_one(Strip).show(self.desk, self.here, unsaved)
        if self.ready:
            self.view(self.here).show(self.desk)
        desk = self.desk
        base.query_one(FrequencyRuler).show(
            RulerData(desk.up_to_hz, shaded(desk), desk.measured_hz, desk.now, desk.after)
        )
        line = reading(self.here, desk).fitted(2 * (self.size.width - 2) - 8)
        base.query_one("#reading", Static).update(safe(line))

    def on_resize(self) -> None:
        """The reading is cut to the width."""
        if self.query("#reading"):
            self.refresh_desk()

    def say_progress(self, doing: str, fraction: float | None = None) -> None:
        """Activity at the right end of the title line."""
        if self.is_running and self.screen_stack:
            self.base.query_one(Strip).say(doing, fraction)

    def on_step_picked(self, message: Step.Picked) -> None:
        """A click on the strip."""
        self.action_view(message.step)

    def action_view(self, name: str) -> None:
        """Go to a view."""
        self.here = name
        if not self.ready:
            return
        self.base.query_one("#views", ContentSwitcher).current = name
        self.refresh_desk()
        self.view(name).focus_home()

    def action_command_palette(self) -> None:
        """Every command by its name."""
        from fieldkit.ui.palette import Palette

        if self.use_command_palette and not isinstance(self.screen, Palette):
            self.push_screen(Palette(id="--command-palette"))

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Escape belongs to windows and plots while there is nothing to stop."""
        if action == "stop":
            return self.desk.working and len(self.screen_stack) == 1
        return super().check_action(action, parameters)

    def action_stop(self) -> None:
        """Stop the work under way."""
        self.stop_work()

    def action_rerun(self) -> None:
        """Work the job out again: a recording may have changed on the disk."""
        self.start_work()

    def action_toggle_light(self) -> None:
        """Dark, light, high contrast, no colour."""
        self.tell(f"{looks.next_look(self)}.")

    def action_copy_view(self) -> None:
        """Everything on screen as plain text, in a window and on the clipboard."""
        from fieldkit.ui.as_text import Told, view_text

        base, name = self.base, self.here.capitalize()
        if isinstance(self.screen, Told):
            text = "\n".join(self.screen.as_text())
        else:
            ruler, reading = base.query_one(FrequencyRuler), base.query_one("#reading")
            text = view_text((self.view(self.here), ruler, reading))
        self.copy_to_clipboard(text)
        self.push_screen(TextScreen(f"{name} as text (copied)", text))

    def action_how(self) -> None:
        """How the numbers on screen are computed, with their sources."""
        from fieldkit.sheet.how import how

        text = "\n".join(how(self.here, self.desk.workup))
        self.push_screen(
            TextScreen(f"How the numbers of {self.here.capitalize()} are computed", text)
        )

    def action_help(self) -> None:
        """List every key."""
        from fieldkit.ui.views.order import VIEWS

        sections = [("Everywhere", self.BINDINGS)]
        sections += [(f"In {view.NAME.capitalize()}", view.BINDINGS) for view in VIEWS]
        self.push_screen(TextScreen("Keys", help_text(sections)))

    def get_system_commands(self, screen: Screen[object]) -> Iterable[SystemCommand]:
        """What the palette offers."""
        for command in COMMANDS:
            yield SystemCommand(command.name, command.help, self._runner(command.action))

    def _runner(self, action: str) -> Callable[[], Awaitable[None]]:
        async def run() -> None:
            await self.run_action(action)

        return run
