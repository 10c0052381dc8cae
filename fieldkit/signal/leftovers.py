"""What the components found so far leave of the taps, and whether one tap stands out by it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.decimation import decimate
from fieldkit.signal.scan import Region
from fieldkit.signal.traces import Component, Trace, residual

_STANDS_OUT = 5.0
"""Share of a tap's energy over the noise that is left, against the median tap's."""
_OVER_NOISE = 3.0
MANY_OF_ITS_OWN = 3
LEAST_TO_COMPARE = 3
"""Taps from which on one can be called odd."""
_ALMOST_ALL = 0.9
_RINGS = 0.2


def leftovers(traces: Sequence[Trace], parts: Sequence[Component], region: Region) -> list[Trace]:
    """What the components leave, at a rate just high enough for the region."""
    out = []
    for tap, trace in enumerate(traces):
        left, rate_hz = decimate(
            residual(trace, tap, parts),
            trace.rate_hz,
            keep_hz=region.high_hz,
            wanted_rate_hz=3 * region.high_hz,
        )
        out.append(Trace(left, rate_hz, trace.noise))
    return out


def stand_out(
    left: Sequence[Trace], whole: Sequence[Trace], parts: Sequence[Component]
) -> tuple[int, ...]:
    """Taps that took several components of their own, with far more left than in the others.

    A tap struck again unnoticed would take dozens. With fewer than three taps nobody can say which
    one is odd: none is.
    """
    if len(left) < LEAST_TO_COMPARE:
        return ()
    energy = np.array([np.mean(t.samples**2) for t in left])
    noise = np.array([noise_power(t) for t in left])
    share = np.maximum(energy - noise, 0.05 * noise) / [np.mean(t.samples**2) for t in whole]
    odd = (share > _STANDS_OUT * np.median(share)) & (energy > _OVER_NOISE * noise)
    odd &= own_components(parts, len(left)) >= MANY_OF_ITS_OWN
    few = np.count_nonzero(odd) <= len(left) - 2
    return tuple(int(i) for i in np.flatnonzero(odd)) if few else ()


def own_components(parts: Sequence[Component], taps: int) -> NDArray[np.int64]:
    """(K,) how many components ring in one tap almost alone."""
    count = np.zeros(taps, int)
    for part in (p for p in parts if not p.steady and p.damping_ratio < _RINGS):
        energy = np.abs(part.amplitudes) ** 2
        top = int(np.argmax(energy))
        count[top] += energy[top] > _ALMOST_ALL * energy.sum()
    return count


def noise_power(trace: Trace) -> float:
    """Mean square of the noise expected in a trace."""
    frequency_hz = np.linspace(0, trace.rate_hz / 2, 129)[1:]
    return float(np.mean(trace.noise.at(frequency_hz))) * trace.rate_hz / 2
