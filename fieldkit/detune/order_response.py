"""How much each order of the machine is amplified, before and after a change.

The worst over the speed range: where the range reaches a mode, that mode is driven at resonance.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fieldkit.detune.excitation import Band
from fieldkit.detune.known_modes import KnownMode
from fieldkit.detune.magnification import DRAWS, HIGH, LOW, SEED, magnification


@dataclass(frozen=True)
class Amplified:
    """The mode that multiplies an excitation most: its deflection over that at rest."""

    times: float
    """At the best values of mode and damping."""
    low: float
    """5 %."""
    high: float
    """95 %."""
    mode: KnownMode


@dataclass(frozen=True)
class OrderResponse:
    """One order now and after a change; None where no mode is known."""

    band: Band
    now: Amplified | None
    after: Amplified | None


def amplified(band: Band, modes: Sequence[KnownMode]) -> Amplified | None:
    """The strongest answer of any mode to an excitation that may stand anywhere in its range."""
    found = [_amplified(band, mode) for mode in modes]
    return max(found, key=lambda one: one.times, default=None)


def _amplified(band: Band, mode: KnownMode) -> Amplified:
    standard = np.random.default_rng(SEED).standard_normal((2, DRAWS))
    natural, damping = mode.frequency.draws(standard[0]), mode.damping.draws(standard[1])
    forcing = np.clip(natural, band.low_hz, band.high_hz)
    low, high = np.quantile(magnification(forcing / natural, damping), (LOW, HIGH))
    best_forcing = min(max(mode.hz, band.low_hz), band.high_hz)
    best = float(magnification(best_forcing / mode.hz, mode.damping.median))
    return Amplified(best, min(float(low), best), max(float(high), best), mode)


def order_responses(
    now: Sequence[Band],
    after: Sequence[Band],
    modes_now: Sequence[KnownMode],
    modes_after: Sequence[KnownMode],
    up_to_hz: float,
) -> tuple[OrderResponse, ...]:
    """Every order below the limit; ``after`` are the same orders where a change moved the speed."""
    return tuple(
        OrderResponse(before, amplified(before, modes_now), amplified(then, modes_after))
        for before, then in zip(now, after, strict=True)
        if before.low_hz <= up_to_hz
    )
