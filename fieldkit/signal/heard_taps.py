"""Taps from their blow on, whitened, with what free decay can make of each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal import preparation
from fieldkit.signal.decays import damped
from fieldkit.signal.decimation import by_phases, lowpass
from fieldkit.signal.normal_equations import real_columns, sums
from fieldkit.signal.traces import Component

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_LOOK_S = 0.8
_RATE_OVER_TOP = 5.0
_STOPBAND_DB = 50.0
_SMEAR = 0.75
"""Periods of the highest frequency over which lowering the rate spreads a contact."""
_MOST_DAMPING = 0.2
"""What dies away sooner is more likely what a second blow has left in the fit than a mode."""
_STRONG = 0.1
_ORDERS = (0, 2, 4, 8)
_NEARLY = 1.3


class Record(preparation.Record, Protocol):
    """What is needed of a tap record besides what a fit needs."""

    @property
    def before(self) -> Real:
        """(p,) samples before the free decay, from before the blow on."""

    @property
    def since_blow_s(self) -> float:
        """From the blow to the first sample."""


@dataclass(frozen=True)
class Heard:
    """One tap from its blow on, and what free decay can make of it."""

    samples: Real
    """(n,)"""
    time_s: Real
    """(n,) after the blow."""
    rate_hz: float
    decays: Complex
    """(n, m) each mode's decay of unit amplitude at the first sample of the record."""
    poles: Complex
    """(m,)"""
    free_s: float
    """When the record begins, after the blow."""
    smear_s: float

    left: Real
    """(n,) what the free decay after the record's start leaves, carried on to before it."""

    highest_hz: float
    """Frequency of the highest mode that is not far weaker than the strongest."""

    def after(self, time_s: float) -> slice:
        """Samples from a time on."""
        return slice(int(np.searchsorted(self.time_s, time_s)), None)

    @property
    def noise(self) -> float:
        """Variance of what free decay leaves, by its median."""
        left = self.left[self.after(self.free_s + 0.03)]
        return (float(np.median(np.abs(left))) / 0.6745) ** 2 + 1e-300 if len(left) else np.inf


def heard_of(record: Record, tap: int, parts: Sequence[Component], top_hz: float) -> Heard | None:
    """A tap at the rate that its modes need, its steady tones taken out."""
    rest = record.background if len(record.background) else record.samples
    lead = len(record.before)
    whole = np.concatenate([record.before, record.samples[: int(_LOOK_S * record.rate_hz)]])
    samples, step, delay, smear_s = lowered(whole - np.mean(rest), record.rate_hz, top_hz)
    rate_hz = record.rate_hz / step
    if len(samples) < 32:
        return None
    from_start_s = (np.arange(len(samples)) * step + delay - lead) / record.rate_hz
    for tone in (part for part in parts if part.steady):
        amplitude = tone.amplitudes[tap] + tone.slopes[tap] * from_start_s
        samples = samples - (amplitude * np.exp(tone.poles[tap] * from_start_s)).real
    poles = poles_of(parts, tap)
    first = complex(from_start_s[0])
    decays = np.stack(
        [np.exp(p * first) * damped(p / rate_hz, len(samples)) for p in poles], axis=1
    )
    free = from_start_s >= 0
    columns = real_columns(decays)
    amplitudes = sums(columns[free], samples[free]).solution
    size = np.hypot(*amplitudes.reshape(2, -1))
    strong = poles[size > _STRONG * size.max(initial=0.0)]
    return Heard(
        samples,
        np.asarray(from_start_s + record.since_blow_s, np.float64),
        rate_hz,
        decays,
        poles,
        record.since_blow_s,
        smear_s,
        samples - columns @ amplitudes,
        float(strong.imag.max(initial=0.0)) / (2 * np.pi),
    )


def poles_of(parts: Sequence[Component], tap: int) -> Complex:
    """(m,) poles in one tap; where a frequency drifts, those of faster decays with it."""
    out = []
    for part in (p for p in parts if not p.steady and p.damping_ratio < _MOST_DAMPING):
        pole = part.poles[tap]
        out += [pole + n * pole.real for n in range(3 if part.bend else 1)]
    return np.array(out)


def lowered(samples: Real, rate_hz: float, top_hz: float) -> tuple[Real, int, float, float]:
    """Every so-manieth sample, how many, the first one's place, and how far a contact spreads."""
    step = int(rate_hz // (_RATE_OVER_TOP * top_hz))
    if step < 2:
        return samples, 1, 0.0, 0.0
    kernel = lowpass(rate_hz, top_hz, rate_hz / step - top_hz, _STOPBAND_DB)
    if len(samples) < 2 * len(kernel):
        return np.zeros(0), step, 0.0, 0.0
    return by_phases(samples, kernel, step), step, (len(kernel) - 1) / 2, _SMEAR / top_hz


def whitener(lefts: Sequence[Real]) -> Real:
    """(p + 1,) prediction-error filter of what free decay leaves: noise, and modes above the range.

    The shortest that is nearly as good as the longest, since every order blurs the blows.
    """
    long = [left for left in lefts if len(left) > 4 * _ORDERS[-1]]
    if not long:
        return np.ones(1)
    filters = [prediction_error(long, order) for order in _ORDERS]
    sizes = [float(np.median([np.median(np.abs(filtered(x, w))) for x in long])) for w in filters]
    good = (w for w, size in zip(filters, sizes, strict=True) if size <= _NEARLY * min(sizes))
    return next(good)


def prediction_error(lefts: Sequence[Real], order: int) -> Real:
    """(order + 1,) least-squares prediction-error filter, every stretch weighing alike."""
    if not order:
        return np.ones(1)
    windows = (np.lib.stride_tricks.sliding_window_view(x, order + 1)[:, ::-1] for x in lefts)
    rows = np.concatenate([w / (np.std(w) + 1e-300) for w in windows])
    products = rows.T @ rows / len(rows)
    ridge = 1e-4 * np.trace(products) / len(products) * np.eye(order)
    return np.concatenate([[1.0], -np.linalg.solve(products[1:, 1:] + ridge, products[1:, 0])])


def whitened(heard: Heard, weights: Real) -> Heard:
    """A tap through a short filter: a decay stays one, and a blow lasts that much longer."""
    order = len(weights) - 1
    gains = np.exp(np.outer(-heard.poles / heard.rate_hz, np.arange(order + 1))) @ weights
    decays = heard.decays[order:] * gains
    scale = np.sqrt(np.sum(np.abs(decays) ** 2, axis=0)) + 1e-300
    return Heard(
        filtered(heard.samples, weights),
        heard.time_s[order:],
        heard.rate_hz,
        decays / scale,
        heard.poles,
        heard.free_s,
        heard.smear_s + order / heard.rate_hz,
        filtered(heard.left, weights),
        heard.highest_hz,
    )


def filtered(samples: Real, weights: Real) -> Real:
    """(n - p,) samples through a filter of p + 1 weights, where it lies wholly inside them."""
    return np.asarray(np.convolve(samples, weights, "valid"), np.float64)
