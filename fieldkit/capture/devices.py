"""The inputs of this computer, with channels and rates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from fieldkit.capture.library import list_anew, portaudio
from fieldkit.errors import InputError, Refusal

RATES_HZ = (8000, 11025, 16000, 22050, 32000, 44100, 48000, 88200, 96000, 192000)
"""The rates that are tried."""


@dataclass(frozen=True)
class Input:
    """One input as PortAudio lists it."""

    index: int
    """Good until the list is made anew."""
    name: str
    host_api: str
    channels: int
    """The most it has."""
    default_rate_hz: int
    rates_hz: tuple[int, ...]
    """Those of RATES_HZ, and its own, that it accepts with one channel."""
    default: bool
    """Whether the system takes it where nobody chooses."""


def list_inputs(*, check_rates: bool = True) -> tuple[Input, ...]:
    """Every input, the list made anew unless a stream is open.

    May take seconds: a thread that must answer leaves it to another. Raises Refusal where PortAudio
    is missing or cannot start, or there is no input.
    """
    with portaudio() as sd:
        try:
            list_anew(sd)
            found = inputs_now(sd, check_rates=check_rates)
        except sd.PortAudioError as error:
            raise Refusal(f"the inputs cannot be listed: {said(error)}", _PLUG_IN) from None
    if not found:
        raise Refusal("this computer has no audio input", _PLUG_IN)
    return found


_PLUG_IN = "plug in the interface or microphone, check that the system lists it, and try again"


def inputs_now(sd: Any, *, check_rates: bool = False) -> tuple[Input, ...]:
    """The inputs as PortAudio has them listed; call inside portaudio()."""
    apis = [api["name"] for api in sd.query_hostapis()]
    preferred = sd.default.device[0]
    if preferred < 0:
        preferred = next(
            (api["default_input_device"] for api in sd.query_hostapis() if api["devices"]), -1
        )
    return tuple(
        Input(
            index,
            device["name"],
            apis[device["hostapi"]],
            device["max_input_channels"],
            round(device["default_samplerate"]),
            _accepted(sd, index, round(device["default_samplerate"])) if check_rates else (),
            index == preferred,
        )
        for index, device in enumerate(sd.query_devices())
        if device["max_input_channels"] > 0
    )


def find_input(wanted: str | int | None, inputs: Sequence[Input]) -> Input:
    """The input of a number, a name or a part of a name; the system's own where None.

    Raises InputError where there is none or several.
    """
    if wanted is None:
        return next((i for i in inputs if i.default), inputs[0])
    if isinstance(wanted, int) or wanted.strip().isdigit():
        matching = [i for i in inputs if i.index == int(wanted)]
    else:
        matching = [i for i in inputs if i.name == wanted] or [
            i for i in inputs if wanted.lower() in i.name.lower()
        ]
    if len(matching) == 1:
        return matching[0]
    what = f"{len(matching)} inputs are called" if matching else "there is no input called"
    names = ", ".join(f"{i.index} ({i.name})" for i in matching or inputs)
    raise InputError(f"{what} {wanted!r}", f"name one of: {names}")


def said(error: Exception) -> str:
    """What PortAudio said, without its number."""
    text = str(error.args[0] if error.args else error)
    return text.rstrip(".") or type(error).__name__


def _accepted(sd: Any, index: int, own_hz: int) -> tuple[int, ...]:
    return tuple(rate for rate in sorted({*RATES_HZ, own_hz}) if _accepts(sd, index, rate))


def _accepts(sd: Any, index: int, rate_hz: int) -> bool:
    try:
        sd.check_input_settings(device=index, channels=1, dtype="float32", samplerate=rate_hz)
    except (sd.PortAudioError, ValueError):
        return False
    return True
