"""The set-up before anything is recorded: cautions, input, channels, presets."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, ClassVar

from textual import work
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.message import Message
from textual.screen import ModalScreen
from textual.widgets import DataTable, Footer

from fieldkit.capture.presets import presets, save_preset
from fieldkit.capture.setup import ChannelSetup
from fieldkit.errors import FieldkitError, InputError
from fieldkit.ui.capture import setup_words as words
from fieldkit.ui.capture.bench import Bench, in_background
from fieldkit.ui.capture.channel_forms import (
    CHANNEL,
    recording_form,
    recording_texts,
    setup_with,
    texts_of,
    wiring_with,
)
from fieldkit.ui.capture.wiring import LAST, Wiring, ears_of
from fieldkit.ui.commands import help_text
from fieldkit.ui.dialogs import PickScreen, TextScreen
from fieldkit.ui.forms import Form, FormWindow, Values
from fieldkit.ui.forms.codecs import Words
from fieldkit.ui.forms.tables import Field
from fieldkit.ui.table import Table
from fieldkit.ui.views.base import plain
from fieldkit.ui.views.tap import CAUTION
from fieldkit.ui.words import safe, sentence
from fieldkit.ui.work import unexpected

if TYPE_CHECKING:
    from fieldkit.capture.devices import Input
    from fieldkit.capture.presets import Preset
    from fieldkit.job.document import Job
    from fieldkit.ui.capture.calibration_run import Calibrated

NAME = Form(
    "recording", "Preset", (Field("name", "name", Words("sensor A on interface B"), needed=True),)
)
Calibrate = Callable[["Calibrated", int], object]


@dataclass
class Listed(Message):
    """The inputs there are, or why there are none."""

    inputs: tuple[Input, ...] = ()
    refused: str = ""


class SetupScreen(ModalScreen[Wiring | None]):
    """Gives the wiring, or None where the user leaves."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("g", "go", "Go", id="setup.go", tooltip="Begin to listen with this set-up"),
        Binding("enter", "enter", "Change", show=False, id="setup.enter",
                tooltip="On an input: to its channels; on a channel: change it"),
        Binding("e", "edit", "Edit channel", id="setup.edit",
                tooltip="What the channel under the cursor is connected to"),
        Binding("r", "recording", "Rate, channels", id="setup.recording",
                tooltip="Rate and channels; for a running recording length and speed"),
        Binding("p", "presets", "Presets", id="setup.presets", tooltip="Take a set-up kept before"),
        Binding("k", "keep", "Keep", id="setup.keep", tooltip="Keep this set-up under a name"),
        Binding("c", "calibrate", "Calibrate", id="setup.calibrate",
                tooltip="Measure the sensitivity of a channel on a reference shaker"),
        Binding("l", "look", "Look again", show=False, id="setup.look",
                tooltip="List the inputs anew"),
        Binding("h", "caution", "Cautions", show=False, id="setup.caution",
                tooltip="The cautions in full"),
        Binding("question_mark", "help", "Keys", show=False, id="setup.help",
                tooltip="List these keys"),
        Binding("escape", "dismiss", "Leave", id="setup.leave", tooltip="Leave without recording"),
    ]  # fmt: skip

    def __init__(
        self,
        wiring: Wiring,
        job: Job,
        bench: Bench,
        calibrate: Calibrate | None = None,
        *,
        fresh: bool = False,
    ) -> None:
        """``calibrate`` gets what a reference shaker said; ``fresh``: nothing was chosen yet."""
        super().__init__()
        self.fresh = fresh
        self.wiring = wiring
        self.job = job
        self.bench = bench
        self.calibrate = calibrate
        self.inputs: tuple[Input, ...] = ()
        self.refused = ""
        self.looking = False
        self._wanted = words.input_key(wiring.device)

    def compose(self) -> ComposeResult:
        """Cautions first."""
        yield plain("live-title", classes="live-title")
        yield plain("setup-caution", classes="live-caution")
        yield Table("input", "channels", "rates, kHz", "through", id="inputs")
        yield plain("inputs-said")
        yield Table("ch", "measures", "sensitivity", "full scale", "direction", "place",
                    id="channels")  # fmt: skip
        yield plain("setup-said")
        yield Footer(compact=True, show_command_palette=False)

    def on_mount(self) -> None:
        """List what is there; the rig is offered at once."""
        title = f" {words.TITLES[self.wiring.kind]}   {self.job.title}"
        self._write("#live-title", title)
        self._write("#setup-caution", words.CAUTIONS[self.wiring.kind])
        self.draw()
        self.query_one("#inputs").focus()
        self.action_look()

    def draw(self) -> None:
        """Tables and sentences."""
        inputs = self.query_one("#inputs", Table)
        inputs.fill(words.input_rows(self.inputs))
        inputs.choose(words.input_key(self.wiring.device))
        self._write(
            "#inputs-said",
            words.inputs_said(looking=self.looking, refused=self.refused, inputs=self.inputs),
        )
        self._draw_channels()

    def _draw_channels(self) -> None:
        self.query_one("#channels", Table).fill(words.channel_rows(self._channels()))
        wrong = self._objection()
        said = f"✗ {sentence(wrong)}" if wrong else f"g begins: {words.summary(self.wiring)}"
        self._write("#setup-said", said)

    def _channels(self) -> tuple[ChannelSetup, ...]:
        try:
            return self.wiring.channels(self.job)
        except FieldkitError:
            return self.wiring.typed

    def _objection(self) -> str:
        """Why this set-up cannot begin."""
        try:
            ears_of(self.wiring.channels(self.job))
        except FieldkitError as error:
            return str(error)
        return ""

    def _write(self, selector: str, text: str) -> None:
        self.query_one(selector).update(safe(text))  # type: ignore[attr-defined]

    def action_look(self) -> None:
        """List the inputs anew."""
        self.looking = True
        self.draw()
        in_background(self, self._listed)

    def _listed(self) -> Message:
        try:
            return Listed(self.bench.list_inputs())
        except FieldkitError as error:
            return Listed(refused=str(error))
        except Exception as error:
            return Listed(refused=unexpected(error))

    def on_listed(self, message: Listed) -> None:
        """The list is there; the input used last is chosen where it is."""
        self.looking, self.inputs, self.refused = False, message.inputs, message.refused
        wanted = [i for i in self.inputs if words.input_key(i) == self._wanted]
        self.wiring = self.wiring.on(wanted[0] if wanted else None)
        self._take_last()
        self.draw()

    def _take_last(self) -> None:
        """The first time, begin with what was used on the last visit, where it is there."""
        if not self.fresh or not self.inputs:
            return
        self.fresh = False
        kept = self._presets().get(LAST)
        if kept is not None and any(one.name == kept.device for one in self.inputs):
            self.wiring = self.wiring.from_preset(LAST, kept, self.inputs)
            self._wanted = words.input_key(self.wiring.device)

    def on_data_table_row_highlighted(self, event: DataTable.RowHighlighted) -> None:
        """The input under the cursor is the chosen one."""
        if event.data_table.id != "inputs" or self.looking:
            return
        key = self.query_one("#inputs", Table).chosen
        device = next((i for i in self.inputs if words.input_key(i) == key), None)
        if device != self.wiring.device:
            self.wiring = self.wiring.on(device)
            self._wanted = words.input_key(device)
            self._draw_channels()

    def on_data_table_row_selected(self, event: DataTable.RowSelected) -> None:
        """Enter goes on."""
        if event.data_table.id == "inputs":
            self.query_one("#channels").focus()
        else:
            self.action_edit()

    @property
    def channel(self) -> int:
        """The channel under the cursor."""
        return int(self.query_one("#channels", Table).chosen or 0)

    @work
    async def action_edit(self) -> None:
        """Change a channel."""
        index, setup = self.channel, self._channels()[self.channel]

        def changed(values: Values) -> Wiring:
            return self.wiring.with_setup(index, setup_with(setup, values))

        await self._ask(CHANNEL, f"Channel {index + 1}", texts_of(setup), changed)

    @work
    async def action_recording(self) -> None:
        """Change rate and channels."""
        form = recording_form(self.wiring, self.job)
        texts = recording_texts(self.wiring)
        await self._ask(form, "Recording", texts, lambda v: wiring_with(self.wiring, v))

    async def _ask(
        self, form: Form, title: str, texts: dict[str, str], changed: Callable[[Values], Wiring]
    ) -> None:
        def objection(values: Values) -> str:
            try:
                changed(values)
            except FieldkitError as error:
                return str(error)
            return ""

        window = FormWindow(form, title, texts, self.job.units, objection)
        values = await self.app.push_screen_wait(window)
        if values:
            self.wiring = changed(values)
            self.draw()

    @work
    async def action_presets(self) -> None:
        """Take a set-up kept before."""
        kept = self._presets()
        if not kept:
            self.notify("No set-up was kept yet: k keeps this one.", markup=False)
            return
        offered = [(str(i), safe(name)) for i, name in enumerate(kept)]
        picked = await self.app.push_screen_wait(PickScreen("Which set-up?", offered))
        if picked is not None:
            name = list(kept)[int(picked)]
            self.wiring = self.wiring.from_preset(name, kept[name], self.inputs)
            self._wanted = words.input_key(self.wiring.device)
            self.draw()

    def _presets(self) -> dict[str, Preset]:
        try:
            return presets(self.bench.presets_path)
        except InputError as error:
            self.notify(str(error), severity="error", markup=False)
            return {}

    @work
    async def action_keep(self) -> None:
        """Keep this set-up."""
        start = {"name": self.wiring.preset if self.wiring.preset != LAST else ""}
        window = FormWindow(NAME, "Keep this set-up as", start, self.job.units, self._kept)
        values = await self.app.push_screen_wait(window)
        name = (values or {}).get("name")
        if name:
            self.wiring = replace(self.wiring, preset=name)
            self.draw()

    def _kept(self, values: Values) -> str:
        """Keep under a typed name; a sentence where it cannot be."""
        try:
            save_preset(values["name"], self.wiring.as_preset(), self.bench.presets_path)
        except InputError as error:
            return str(error)
        return ""

    @work
    async def action_calibrate(self) -> None:
        """On a screen of its own; a new sensitivity comes into the set-up."""
        from fieldkit.ui.capture.calibration_screen import CalibrationScreen

        index = self.channel
        wrong = self._objection()
        if not wrong and self._channels()[index].quantity != "acceleration":
            wrong = "a reference shaker calibrates accelerometers only"
        if wrong:
            self.notify(sentence(wrong), severity="error", markup=False)
            return
        screen = CalibrationScreen(self.wiring, index, self.job, self.bench)
        found = await self.app.push_screen_wait(screen)
        if found is not None:
            self.wiring = found.wiring
            if self.calibrate is not None:
                self.calibrate(found, index)
            self.draw()

    def action_caution(self) -> None:
        """The cautions in full."""
        self.app.push_screen(TextScreen("Caution", CAUTION))

    def action_help(self) -> None:
        """List every key."""
        section = (words.TITLES[self.wiring.kind], self.BINDINGS)
        self.app.push_screen(TextScreen("Keys", help_text([section])))

    def action_go(self) -> None:
        """Begin."""
        wrong = self._objection()
        if wrong:
            self.notify(sentence(wrong), severity="error", markup=False)
            return
        if not self.wiring.practice:
            self._kept_last()
        self.dismiss(self.wiring)

    def _kept_last(self) -> None:
        try:
            save_preset(LAST, self.wiring.as_preset(), self.bench.presets_path)
        except InputError as error:
            self.notify(str(error), severity="warning", markup=False)
