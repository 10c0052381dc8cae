"""The hammer's channel of a tap recording: what it says of each blow, and the response it gives."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import HammerEntry, RecordingEntry
from fieldkit.signal.blows import GUARD_S
from fieldkit.signal.hammer import (
    ForceSpectrum,
    Pulse,
    around,
    dips_hz,
    force_alone,
    force_spectrum,
    read_pulse,
)
from fieldkit.signal.recording import Recording, channel_signal
from fieldkit.signal.response import FrequencyResponse, Struck, frequency_response
from fieldkit.signal.taps import Tap, TapSearch

Real = NDArray[np.float64]
Read = Callable[[int, int], Real]
"""Samples from one number up to another, cut at the ends of the recording."""

HIGHEST_HZ = 5000.0
"""No job looks at higher modes."""
NYQUIST_SHARE = 0.4
_BEFORE_S = 0.005
_LONGEST_QUIET_S = 30.0
_MOST_DIPS = 3
_ENOUGH_SAMPLES = 8
"""Of a half sine, fewer give the impulse more than 1.3 % wrong: 1 - pi^2 / (12 n^2)."""


@dataclass(frozen=True)
class HammerReading:
    """What the force channel of one recording says."""

    response: FrequencyResponse | None
    """None where no usable blow has its force on record."""
    force: ForceSpectrum | None
    refused: str = ""
    """Why there is no response."""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True)
class Good:
    """A blow that can be used, with its force."""

    tap: Tap
    pulse: Pulse
    until_s: float
    """Where the next one may begin."""


@dataclass(frozen=True)
class TwoChannels:
    """Sensor and hammer of one recording, read by the stretch."""

    sensor: Read
    hammer: Read
    rate_hz: float
    full_scale: float | None
    """Where the hammer's channel clips; None where it has no known rail."""


def with_hammer(
    entry: RecordingEntry,
    recording: Recording,
    signal: Real,
    search: TapSearch,
    quantity: str | None,
    scale: float | None,
) -> tuple[TapSearch, HammerReading | None]:
    """``read_hammer`` for a recording that is loaded whole; nothing changes without a hammer.

    Raises InputError where the recording lacks the hammer's channel.
    """
    if entry.hammer is None:
        return search, None
    force = force_of(entry.hammer, recording, entry)
    read = TwoChannels(
        lambda first, past: signal[first:past],
        lambda first, past: force[first:past],
        recording.rate_hz,
        recording.full_scale,
    )
    return read_hammer(search, read, entry.hammer, quantity, scale)


def force_of(hammer: HammerEntry, recording: Recording, entry: RecordingEntry) -> Real:
    """(n,) samples of the hammer's channel; InputError where there is none."""
    try:
        return channel_signal(recording, hammer.channel)
    except InputError as error:
        what = f"its hammer is said to be on channel {hammer.channel}: {error.what}"
        raise InputError(what, error.remedy, error.place).at(file=entry.path) from error


def read_hammer(
    search: TapSearch,
    read: TwoChannels,
    hammer: HammerEntry,
    quantity: str | None,
    scale: float | None,
) -> tuple[TapSearch, HammerReading]:
    """The blows as the force shows them, and the response.

    ``quantity`` and ``scale`` are those of the sensor.
    """
    pulses = pulses_of(read, search)
    taps = (judged(t, p, read.rate_hz) for t, p in zip(search.taps, pulses, strict=True))
    search = replace(search, taps=tuple(taps))
    fit = [
        Good(tap, pulse, until_s)
        for tap, pulse, until_s in zip(search.taps, pulses, limits_s(search), strict=True)
        if tap.usable and pulse is not None and not pulse.clipped
    ]
    if not fit:
        return search, HammerReading(None, None, nothing_struck(hammer, search, pulses))
    found = [good.pulse for good in fit]
    contacts = [force_alone(read.hammer(p.first, p.end), p, p.first) for p in found]
    spectrum = force_spectrum(contacts, read.rate_hz)
    try:
        response = frequency_response(
            [struck(read, search, good) for good in fit],
            read.rate_hz,
            high_hz=min(HIGHEST_HZ, NYQUIST_SHARE * read.rate_hz),
            quantity=quantity,
            scale=scale,
            force_scale=hammer.scale,
        )
    except Refusal as refusal:
        return search, HammerReading(None, spectrum, str(refusal))
    return search, HammerReading(response, spectrum, notes=tuple(remarks(search, pulses, found)))


def pulses_of(read: TwoChannels, search: TapSearch) -> list[Pulse | None]:
    """The force of each blow, None where none stands out."""
    ranges = [
        around(tap.at_s, until_s, read.rate_hz)
        for tap, until_s in zip(search.taps, limits_s(search), strict=True)
    ]
    return [
        read_pulse(read.hammer(first, past), read.rate_hz, first, full_scale=read.full_scale)
        for first, past in ranges
    ]


def limits_s(search: TapSearch) -> list[float]:
    """Where the blow after each one may begin; infinite for the last."""
    later = [tap.at_s - GUARD_S for tap in search.taps[1:]]
    return [*later, np.inf][: len(search.taps)]


def judged(tap: Tap, pulse: Pulse | None, rate_hz: float) -> Tap:
    """The tap with its free decay from where the force ends, refused where it struck twice."""
    if pulse is None:
        return tap
    start = min(pulse.end, tap.end)
    if len(pulse.hits) < 2:
        return replace(tap, start=start)
    known = [reason for reason in tap.reasons if not reason.startswith("struck twice")]
    return replace(tap, start=start, usable=False, reasons=(*known, struck_twice(pulse)))


def struck_twice(pulse: Pulse) -> str:
    """What the force says of a double hit."""
    first, second = pulse.hits[:2]
    gap_s = second.after_s - first.after_s
    dips = ", ".join(f"{hz:.3g}" for hz in dips_hz(gap_s, 2 * _MOST_DIPS / gap_s)[:_MOST_DIPS])
    return (
        f"struck twice: the hammer shows another hit {1000 * gap_s:.3g} ms after the first, "
        f"{100 * second.share / first.share:.0f} % as hard, so its force has dips at {dips} Hz; "
        "let the hammer rebound freely, or use a lighter one"
    )


def struck(read: TwoChannels, search: TapSearch, good: Good) -> Struck:
    """Force and response of one blow from just before its contact until it has died away.

    Twice as long as it is heard over the noise where the next blow leaves room: what the noise
    hides of a decay still belongs to its peak.
    """
    pulse = good.pulse
    first = max(pulse.first - round(_BEFORE_S * read.rate_hz), 0)
    heard = good.tap.end - first
    past = max(int(min(first + 2 * heard, good.until_s * read.rate_hz)), good.tap.end)
    whole = read.sensor(first, past)
    alone = force_alone(read.hammer(first, past), pulse, first)
    ring_s = (first + len(whole) - pulse.top) / read.rate_hz
    return Struck(alone, whole - rest_of(read, search, whole), ring_s)


def rest_of(read: TwoChannels, search: TapSearch, whole: Real) -> float:
    """What the sensor reads at rest."""
    first, past = search.background
    quiet = read.sensor(max(first, past - round(_LONGEST_QUIET_S * read.rate_hz)), past)
    return float(np.mean(quiet if len(quiet) else whole))


def nothing_struck(hammer: HammerEntry, search: TapSearch, pulses: Sequence[Pulse | None]) -> str:
    """Why no blow gives a response."""
    if any(pulse is not None and pulse.clipped for pulse in pulses):
        return (
            "the force of every usable blow is clipped; lower the input gain of the hammer's "
            "channel, or hit softer"
        )
    if search.taps and all(pulse is None for pulse in pulses):
        return (
            f"channel {hammer.channel} shows no force at the blows; check the hammer's cable and "
            "supply, and which channel it is plugged into"
        )
    return "no usable blow has its force on record; tap again, each blow once and left to ring out"


def remarks(
    search: TapSearch,
    pulses: Sequence[Pulse | None],
    found: Sequence[Pulse],
) -> list[str]:
    """What to know about a response made of the pulses that were ``found`` good."""
    out = []
    if len(found) == 1:
        out.append("one blow only: coherence needs two or more, so nothing shows how good it is")
    usable = [p for t, p in zip(search.taps, pulses, strict=True) if t.usable]
    fewest = min(pulse.contact for pulse in found)
    if fewest < _ENOUGH_SAMPLES:
        out.append(
            f"the contact lasts {fewest} samples only, too few to read the force well; record at a "
            "higher rate, or use a softer tip"
        )
    silent = sum(pulse is None for pulse in usable)
    clipped = sum(pulse is not None and bool(pulse.clipped) for pulse in usable)
    if silent:
        out.append(f"{told(silent)} no force on the hammer's channel and is left out of it")
    if clipped:
        out.append(f"{told(clipped)} its force clipped and is left out; lower the hammer's gain")
    return out


def told(count: int) -> str:
    """``1 usable blow has``; the verb serves both."""
    return f"{count} usable blow has" if count == 1 else f"each of {count} usable blows has"
