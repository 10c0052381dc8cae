"""What is to be measured with: input, rate, channels, and for a running recording its length."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

from fieldkit.capture.places import Ear, Place
from fieldkit.capture.setup import FORCE, ChannelSetup
from fieldkit.errors import InputError

if TYPE_CHECKING:
    from fieldkit.capture.devices import Input
    from fieldkit.capture.practice import PracticeSource
    from fieldkit.capture.presets import Preset
    from fieldkit.capture.source import Source
    from fieldkit.job.document import Job
    from fieldkit.ui.capture.bench import Bench

LAST = "last used"
"""The preset that the last measurement was made with."""
RUNNING_S = 60.0


@dataclass(frozen=True)
class Wiring:
    """A set-up as far as it is chosen."""

    kind: str
    """``tap`` or ``running``."""
    device: Input | None = None
    """None: the practice rig."""
    rate_hz: int | None = None
    """None: the input's own."""
    setups: tuple[ChannelSetup, ...] = (ChannelSetup(direction="vertical"),)
    """Of a real input, as typed."""
    rig_setups: tuple[ChannelSetup, ...] = (ChannelSetup(direction="vertical"),)
    """Of the practice rig: what is tried there must not pass for what is written on a sensor."""
    preset: str = ""
    seconds: float = RUNNING_S
    """Of a running recording."""
    speeds_hz: dict[str, float] = field(default_factory=dict)
    """Speed that was read off each machine, by its name in the job."""

    @property
    def practice(self) -> bool:
        """Whether nothing is connected."""
        return self.device is None

    @property
    def typed(self) -> tuple[ChannelSetup, ...]:
        """The channels of this input as typed; ``channels`` is what comes of them."""
        return self.rig_setups if self.practice else self.setups

    def _with_typed(self, setups: tuple[ChannelSetup, ...]) -> Wiring:
        if self.practice:
            return replace(self, rig_setups=setups)
        return replace(self, setups=setups)

    def channels(self, job: Job) -> tuple[ChannelSetup, ...]:
        """One for each channel; raises InputError where the rig has no such sensor."""
        if self.device is not None:
            return self.setups[: self.device.channels]
        from fieldkit.workup.practice import practice_channels

        return practice_channels(job, self.rig_setups)

    def rate(self) -> int:
        """Frames a second that will come."""
        if self.device is not None:
            return self.rate_hz or self.device.default_rate_hz
        from fieldkit.capture.practice import RATE_HZ

        return RATE_HZ

    def on(self, device: Input | None) -> Wiring:
        """With another input; a rate that it does not know is let go."""
        known = device is not None and self.rate_hz in device.rates_hz
        return replace(self, device=device, rate_hz=self.rate_hz if known else None)

    def with_count(self, count: int) -> Wiring:
        """With so many channels; new ones are bare."""
        return self._with_typed((*self.typed, *[ChannelSetup()] * count)[:count])

    def with_setup(self, index: int, setup: ChannelSetup) -> Wiring:
        """With one channel changed."""
        return self._with_typed((*self.typed[:index], setup, *self.typed[index + 1 :]))

    def as_preset(self) -> Preset:
        """To keep for the next visit."""
        from fieldkit.capture.presets import Preset

        name = self.device.name if self.device else ""
        return Preset(self.typed, name, self.rate_hz)

    def from_preset(self, name: str, preset: Preset, inputs: Sequence[Input]) -> Wiring:
        """As it was kept; the input too, where it is there."""
        same = [one for one in inputs if preset.device and one.name == preset.device]
        device = same[0] if same else self.device
        found = replace(self, rate_hz=preset.rate_hz, preset=name)
        return found.on(device)._with_typed(preset.channels)


def ears_of(channels: Sequence[ChannelSetup]) -> tuple[Ear, ...]:
    """The channels that hear the response; raises InputError where there is none."""
    heard = [(i, setup) for i, setup in enumerate(channels) if setup.quantity != FORCE]
    if not heard:
        raise InputError("every channel is a hammer's", "connect a sensor to one of them")
    alike = len({setup.quantity for _, setup in heard}) == 1
    scales = [setup.si_per_unit for _, setup in heard]
    if not alike or None in scales:
        scales = [1.0] * len(heard)
    return tuple(
        Ear(i, Place(setup.direction, setup.at_m), scale or 1.0)
        for (i, setup), scale in zip(heard, scales, strict=True)
    )


def hammer_of(channels: Sequence[ChannelSetup]) -> int | None:
    """The channel of the hammer's force, from 0."""
    return next((i for i, setup in enumerate(channels) if setup.quantity == FORCE), None)


def source_of(job: Job, wiring: Wiring, bench: Bench) -> Source | PracticeSource:
    """What streams; may take seconds. Raises InputError or Refusal."""
    channels = wiring.channels(job)
    if wiring.device is not None:
        from fieldkit.capture.portaudio import PortAudioSource

        return PortAudioSource(wiring.device, rate_hz=wiring.rate_hz, channels=len(channels))
    from fieldkit.workup.practice import practice_source

    return practice_source(job, channels, running=wiring.kind == "running", pace=bench.pace)
