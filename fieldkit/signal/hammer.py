"""The force of a hammer blow: when it acts, whether it struck twice, how far up it excites."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.clipping import clipped_at

Real = NDArray[np.float64]

DOUBLE_SHARE = 0.1
"""Of the hardest hit: a further one above it spoils the blow (common practice, no source)."""
USABLE_DROP_DB = 20.0
"""Below its maximum, the force excites too little to be measured with (common practice, no
source)."""
_BEFORE_S = 0.06
_AFTER_S = 0.35
_LEAST_OVER_NOISE = 12.0
_FLOOR_OVER_NOISE = 8.0
_FLOOR_SHARE = 0.03
_MARGIN = 0.1
"""Of the contact, kept at each end: what lies below the floor."""
_SPREAD_TO_SD = 1.4826
_LINES_PER_CONTACT = 64


@dataclass(frozen=True)
class Hit:
    """One rise and fall of the force."""

    after_s: float
    """Time of its top after that of the first one."""
    share: float
    """Of the hardest one's force."""


@dataclass(frozen=True)
class Pulse:
    """What the force does in one blow."""

    first: int
    """First sample of the contact."""
    end: int
    """One past the last sample in which any force acts, that of weak further hits included."""
    top: int
    """Sample of the largest force."""
    peak: float
    """Largest force less the rest, in the samples' unit; negative where a push reads negative."""
    rest: float
    """What the channel reads without force."""
    hits: tuple[Hit, ...]
    """In order of time; one for a clean blow."""
    contact: int
    """Samples in which the hardest hit acts."""
    clipped: int = 0
    """Samples that stand at a rail."""

    @property
    def margin(self) -> int:
        """Samples kept at each end for what lies below the floor."""
        return max(2, round(_MARGIN * self.contact))


def around(at_s: float, until_s: float, rate_hz: float) -> tuple[int, int]:
    """Range of samples that holds the force of the blow that the sensor shows at ``at_s``.

    ``until_s`` is where the next blow may begin. A blow may reach the sensor a little after the
    hammer, and a second hit may follow it.
    """
    first = max(int((at_s - _BEFORE_S) * rate_hz), 0)
    return first, max(int(min(at_s + _AFTER_S, until_s) * rate_hz), first)


def read_pulse(
    near: Real, rate_hz: float, begin: int = 0, *, full_scale: float | None = None
) -> Pulse | None:
    """The force among the samples around a blow; None where none stands out.

    ``near`` (n,) are samples of the hammer's channel, ``begin`` the number of the first one in
    the recording; ``full_scale`` is where the channel clips, None where it has no known rail.
    """
    if len(near) < 8:
        return None
    rest = float(np.median(near))
    noise = _SPREAD_TO_SD * float(np.median(np.abs(near - rest)))
    push = near - rest
    top = int(np.argmax(np.abs(push)))
    peak = float(push[top])
    if peak == 0 or abs(peak) < _LEAST_OVER_NOISE * noise:
        return None
    sign = float(np.sign(peak))
    push = np.maximum(sign * push, 0.0)
    rail = None if full_scale is None else full_scale - sign * rest
    floor = max(_FLOOR_OVER_NOISE * noise, _FLOOR_SHARE * abs(peak))
    acting = np.flatnonzero(push > floor)
    pulse = Pulse(
        first=begin + int(acting[0]),
        end=begin + int(acting[-1]) + 1,
        top=begin + top,
        peak=peak,
        rest=rest,
        hits=hits_of(push, acting, rate_hz),
        contact=contact_samples(push, top, floor),
        clipped=len(clipped_at(push, rail)),
    )
    first, end = pulse.first - pulse.margin, pulse.end + pulse.margin
    return replace(pulse, first=max(first, begin), end=min(end, begin + len(near)))


def contact_samples(push: Real, top: int, floor: float) -> int:
    """Samples around the largest force in which it stays above the floor."""
    below = np.flatnonzero(push <= floor)
    before, after = below[below < top], below[below > top]
    first = int(before[-1]) + 1 if len(before) else 0
    past = int(after[0]) if len(after) else len(push)
    return past - first


def hits_of(push: Real, acting: NDArray[np.intp], rate_hz: float) -> tuple[Hit, ...]:
    """The hits among the samples in which force acts.

    A hit ends where the force has fallen to less than half of its top; another one begins where it
    rises to twice the lowest since, and to a tenth of the hardest.
    """
    peak = float(push.max())
    tops: list[int] = []
    top, valley, last = int(acting[0]), np.inf, int(acting[0])
    for i in map(int, acting):
        value = float(push[i])
        if i > last + 1:
            valley = min(valley, float(push[last + 1 : i].min()))
        fell = valley < push[top] / 2
        if fell and value > 2 * valley and value >= DOUBLE_SHARE * peak:
            tops.append(top)
            top, valley = i, value
        elif value > push[top] and not fell:
            top, valley = i, value
        else:
            valley = min(valley, value)
        last = i
    tops.append(top)
    strong = [i for i in tops if push[i] >= DOUBLE_SHARE * peak]
    return tuple(Hit((i - strong[0]) / rate_hz, float(push[i]) / peak) for i in strong)


def force_alone(stretch: Real, pulse: Pulse, first: int) -> Real:
    """(n,) the stretch that begins at sample ``first``, less its rest, without all but the contact.

    The margin behind the contact sinks to zero by half a cosine, so that no step is left.
    """
    out = np.zeros(len(stretch))
    begin, end = max(pulse.first - first, 0), min(pulse.end - first, len(stretch))
    kept = stretch[begin:end] - pulse.rest
    fade = min(pulse.margin, len(kept))
    kept[-fade:] *= 0.5 + 0.5 * np.cos(np.pi * np.arange(1, fade + 1) / (fade + 1))
    out[begin:end] = kept
    return out


@dataclass(frozen=True)
class ForceSpectrum:
    """How much of each frequency the blows hold."""

    frequency_hz: Real
    """(m,) evenly spaced from 0 to half the rate."""
    amplitude: Real
    """(m,) root mean square over the blows of the magnitude, unit of the samples times second."""
    usable_to_hz: float | None
    """Where it has fallen 20 dB below its maximum; None where it nowhere does."""


def force_spectrum(contacts: Sequence[Real], rate_hz: float) -> ForceSpectrum:
    """Spectrum of contacts, each (n_k,) as ``force_alone`` leaves it and no longer.

    Padded with zeros to some dozens of lines to the width of one.
    """
    count = 2 ** int(np.ceil(np.log2(_LINES_PER_CONTACT * max(map(len, contacts)))))
    lines = [np.abs(np.fft.rfft(contact, count)) / rate_hz for contact in contacts]
    amplitude = np.sqrt(np.mean(np.square(lines), axis=0))
    frequency_hz = np.arange(len(amplitude)) * rate_hz / count
    return ForceSpectrum(frequency_hz, amplitude, fallen_at(frequency_hz, amplitude))


def fallen_at(frequency_hz: Real, amplitude: Real) -> float | None:
    """First frequency above the maximum at which it has fallen 20 dB, between lines; else None."""
    limit = float(amplitude.max()) * 10 ** (-USABLE_DROP_DB / 20)
    start = int(np.argmax(amplitude))
    low = np.flatnonzero(amplitude[start:] < limit)
    if not len(low):
        return None
    after = start + int(low[0])
    span = amplitude[after - 1 : after + 1]
    share = (span[0] - limit) / (span[0] - span[1])
    return float(frequency_hz[after - 1] + share * (frequency_hz[after] - frequency_hz[after - 1]))


def dips_hz(gap_s: float, up_to_hz: float) -> tuple[float, ...]:
    """Where two hits so far apart cancel each other: odd multiples of 1 / (2 gap)."""
    first = 1 / (2 * gap_s)
    return tuple(float(first * k) for k in np.arange(1, max(up_to_hz / first, 0) + 1, 2))
