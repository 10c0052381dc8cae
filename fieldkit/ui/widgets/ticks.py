"""Where an axis bears ticks, and how its numbers are written."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
FEW_DECADES = 1.3
"""Below this many decades a logarithmic axis bears evenly spaced ticks."""


def tick_step(span: float, most: int) -> float:
    """Smallest step of 1, 2 or 5 times a power of ten that cuts ``span`` into at most ``most``."""
    if not (math.isfinite(span) and span > 0):
        return 1.0
    return round_up(span / max(1, most))


def round_down(value: float) -> float:
    """The largest of 1, 2 and 5 times a power of ten that is not above a positive value."""
    decade = 10.0 ** math.floor(math.log10(value))
    return max((m * decade for m in (1, 2, 5) if m * decade <= value * (1 + 1e-9)), default=decade)


def round_up(value: float) -> float:
    """The smallest of 1, 2 and 5 times a power of ten that is not below a positive value."""
    decade = 10.0 ** math.floor(math.log10(value))
    return min(m * decade for m in (1, 2, 5, 10) if m * decade >= value * (1 - 1e-9))


def linear_ticks(low: float, high: float, most: int) -> Floats:
    """Multiples of a 1-2-5 step from ``low`` to ``high``, at most ``most`` + 1 of them."""
    step = tick_step(high - low, most)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    return np.arange(first, last + 1, dtype=np.float64) * step


def log_ticks(low: float, high: float, most: int) -> Floats:
    """Ticks for a logarithmic axis: 1-2-5 in each decade, or whole decades where those crowd."""
    decades = math.log10(high / low)
    if decades < FEW_DECADES:
        return linear_ticks(low, high, most)
    first, last = math.floor(math.log10(low)), math.ceil(math.log10(high))
    for mantissas in ((1, 2, 5), (1, 3), (1,)):
        if len(mantissas) * decades <= most:
            return _inside(low, high, range(first, last + 1), mantissas)
    every = math.ceil(decades / max(1, most))
    return _inside(low, high, range(every * math.ceil(first / every), last + 1, every), (1,))


def _inside(low: float, high: float, decades: range, mantissas: Sequence[int]) -> Floats:
    ticks = np.array([m * 10.0**decade for decade in decades for m in mantissas])
    return ticks[(ticks >= low * (1 - 1e-9)) & (ticks <= high * (1 + 1e-9))]


def tick_labels(ticks: Floats) -> list[str]:
    """Numbers as an axis shows them: as many decimals as tell neighbours apart.

    Powers of ten beyond 10,000 and below 0.001 are written with an exponent.
    """
    if len(ticks) == 0:
        return []
    largest = float(np.max(np.abs(ticks)))
    if largest >= 1e5 or largest < 1e-2:
        return [_exponent(tick) for tick in ticks]
    if _evenly_spaced(ticks):
        step = float(ticks[1] - ticks[0]) if len(ticks) > 1 else abs(float(ticks[0])) or 1.0
        decimals = max(0, -math.floor(math.log10(step) + 1e-9))
        return [f"{tick + 0.0:.{decimals}f}" for tick in ticks]
    return [f"{tick:g}" if tick >= 1e-3 else _exponent(tick) for tick in ticks]


def _evenly_spaced(ticks: Floats) -> bool:
    gaps = np.diff(ticks)
    if len(gaps) == 1:
        # Neighbouring multiples of one step are at most a factor of two apart, unless one is 0.
        return not 0 < 2.5 * ticks[0] < ticks[1]
    return len(gaps) == 0 or bool(np.allclose(gaps, gaps[0]))


def _exponent(value: float) -> str:
    if value == 0:
        return "0"
    mantissa, exponent = f"{value:.1e}".split("e")
    return f"{mantissa.removesuffix('.0')}e{int(exponent)}"


def frequency_text(frequency_hz: float) -> str:
    """A frequency to about four digits, without its unit: ``7.32``, ``23.4``, ``148``, ``2310``."""
    if not math.isfinite(frequency_hz):
        return "?"
    decimals = 2 if abs(frequency_hz) < 9.995 else 1 if abs(frequency_hz) < 99.95 else 0
    return f"{frequency_hz:.{decimals}f}"


def amount_text(value: float, unit: str = "") -> str:
    """A value to three digits with its unit: ``0.0412 m/s^2``, ``1.2e-5 m``."""
    if not math.isfinite(value):
        return "?"
    plain = value == 0 or 1e-3 <= abs(value) < 1e5
    digits = f"{value:.3g}" if plain and abs(value) < 1000 else f"{value:.0f}" if plain else ""
    return f"{digits or _exponent(float(f'{value:.2e}'))} {unit}".strip()
