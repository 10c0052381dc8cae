"""What the set-up says: cautions, inputs, channels, in rows and sentences."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from fieldkit.ui.table import Row
from fieldkit.ui.words import DASH, sentence

if TYPE_CHECKING:
    from fieldkit.capture.devices import Input
    from fieldkit.capture.setup import ChannelSetup
    from fieldkit.ui.capture.wiring import Wiring

PRACTICE = "practice"
PRACTICE_NAME = "No sensor here: practice rig"
TITLES = {"tap": "Guided tap test: set-up", "running": "Running recording: set-up"}
CAUTIONS = {
    "tap": (
        "! Ask the operator first. No hot or pressurised line and no hazardous area without a "
        "permit; rotating machine stopped, or keep clear. Soft hammer. Local rules come first (h)."
    ),
    "running": (
        "! Ask the operator first. Keep hands, cables and sleeves clear of rotating and hot parts; "
        "in a hazardous area only with a permit and equipment allowed there. Local rules come "
        "first (h)."
    ),
}
LOOKING = "Looking for inputs; it may take half a minute where the audio system is stuck ..."
WORKS_WITHOUT = (
    "Without an input all else works: the practice rig, recordings made elsewhere (a in Tap and "
    "Running), peaks typed in (p in Tap)."
)


def input_rows(inputs: Sequence[Input]) -> list[Row]:
    """The rig first, then every input with channels and rates."""
    rows: list[Row] = [(PRACTICE, (PRACTICE_NAME, "as typed", "8", "simulated"))]
    rows += [
        (
            input_key(one),
            (
                one.name,
                str(one.channels),
                " ".join(f"{rate / 1000:g}" for rate in one.rates_hz) or "none",
                f"{one.host_api}{', default' if one.default else ''}",
            ),
        )
        for one in inputs
    ]
    return rows


def input_key(device: Input | None) -> str:
    """Key of an input's row."""
    return PRACTICE if device is None else f"{device.index} {device.name}"


def inputs_said(*, looking: bool, refused: str, inputs: Sequence[Input]) -> str:
    """What there is to say of the list."""
    if looking:
        return LOOKING
    if refused:
        return f"{sentence(refused)} {WORKS_WITHOUT}"
    return "" if inputs else WORKS_WITHOUT


def channel_rows(channels: Sequence[ChannelSetup]) -> list[Row]:
    """One for each channel."""
    return [
        (
            str(index),
            (
                str(index + 1),
                setup.quantity,
                setup.scale or setup.sensitivity or "uncalibrated",
                setup.full_scale or DASH,
                setup.direction or "not said",
                setup.at or "not said",
            ),
        )
        for index, setup in enumerate(channels)
    ]


def summary(wiring: Wiring) -> str:
    """Rate, length, speeds and preset, one line."""
    parts = [f"{wiring.rate() / 1000:g} kHz"]
    if wiring.kind == "running":
        parts.append(f"{wiring.seconds:g} s")
        parts += [f"{name} {60 * hz:.0f} rpm" for name, hz in wiring.speeds_hz.items()]
    if wiring.preset:
        parts.append(f"preset “{wiring.preset}”")
    return ", ".join(parts)
