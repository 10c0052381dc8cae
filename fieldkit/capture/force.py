"""The hammer's channel beside a blow: did it strike once and in range, how far up it excites."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.verdict import CLIPPED, DOUBLE, NO_FORCE, USABLE, Verdict
from fieldkit.errors import Refusal
from fieldkit.signal.decimation import decimate
from fieldkit.signal.hammer import Pulse, around, force_alone, force_spectrum, read_pulse
from fieldkit.signal.response import (
    FrequencyResponse,
    Struck,
    coherence_near,
    frequency_response,
)

Real = NDArray[np.float64]

_LEAD_S = 0.25
"""Before the contact: the filter that lowers the rate begins there."""
_RATE_OF_TOP = 4.0


@dataclass(frozen=True, eq=False)
class ForceReading:
    """What the hammer's channel says of one blow."""

    verdict: Verdict
    pulse: Pulse | None = None
    """None where no force stands out."""
    reaches_hz: float | None = None
    """Where the force has fallen 20 dB below its maximum; None where it nowhere does."""

    def remark(self, up_to_hz: float) -> str:
        """What to change though the blow counts; empty where it excites all that is looked for."""
        if self.reaches_hz is None or self.reaches_hz >= up_to_hz:
            return ""
        return f"its force fades above {self.reaches_hz:.0f} Hz: use a harder tip"


@dataclass(frozen=True)
class ResponseState:
    """How good the response is so far."""

    blows: int
    coherence: tuple[tuple[float, float], ...]
    """(frequency in Hz of a mode, coherence there)."""
    reaches_hz: float | None
    """Lowest over the blows."""


def read_force(
    force: Real, rate_hz: float, blow: int, *, full_scale: float | None = 1.0
) -> ForceReading:
    """Judge the force (n,) of the blow that the sensors show at sample ``blow``."""
    first, past = around(blow / rate_hz, np.inf, rate_hz)
    pulse = read_pulse(force[first:past], rate_hz, first, full_scale=full_scale)
    if pulse is None:
        return ForceReading(Verdict(NO_FORCE, "the hammer's channel shows no force"))
    contact = force_alone(force[pulse.first : pulse.end], pulse, pulse.first)
    reaches_hz = force_spectrum([contact], rate_hz).usable_to_hz
    return ForceReading(_verdict(pulse), pulse, reaches_hz)


def _verdict(pulse: Pulse) -> Verdict:
    if pulse.clipped:
        return Verdict(CLIPPED, f"the hammer's channel stood at full scale {pulse.clipped} times")
    if len(pulse.hits) > 1:
        first, second = pulse.hits[:2]
        after_ms, share = 1000 * (second.after_s - first.after_s), second.share / first.share
        return Verdict(
            DOUBLE, f"the hammer hit again {after_ms:.3g} ms later, {100 * share:.0f} % as hard"
        )
    return Verdict(USABLE)


def struck(response: Real, force: Real, pulse: Pulse, rate_hz: float, up_to_hz: float) -> Struck:
    """Force and response of one blow to the end of its record, at a rate lowered for both alike."""
    first = max(pulse.first - round(_LEAD_S * rate_hz), 0)
    rest = float(np.mean(response[: max(first, 1)]))
    pair = (force_alone(force[first:], pulse, first), response[first:] - rest)
    wanted_hz = _RATE_OF_TOP * up_to_hz
    low = [decimate(one, rate_hz, keep_hz=up_to_hz, wanted_rate_hz=wanted_hz)[0] for one in pair]
    return Struck(low[0], low[1], (len(response) - pulse.top) / rate_hz)


def response_of(
    blows: Sequence[Struck], rate_hz: float, up_to_hz: float
) -> FrequencyResponse | None:
    """H1 and coherence of two or more blows as ``struck`` cuts them, relative; None of fewer."""
    if len(blows) < 2:
        return None
    low_rate_hz = rate_hz / max(int(rate_hz // (_RATE_OF_TOP * up_to_hz)), 1)
    try:
        return frequency_response(blows, low_rate_hz, high_hz=up_to_hz)
    except Refusal:
        return None


def coherence_at(
    response: FrequencyResponse, modes: Sequence[tuple[float, float]]
) -> tuple[tuple[float, float], ...]:
    """(frequency, coherence) at modes of (frequency in Hz, damping ratio)."""
    found = [(hz, coherence_near(response, hz, 2 * damping * hz)) for hz, damping in modes]
    return tuple((hz, value) for hz, value in found if value is not None)
