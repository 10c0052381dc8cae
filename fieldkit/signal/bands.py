"""The transform bins around some poles, for all taps, and the columns a model has there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.decays import geometric
from fieldkit.signal.traces import Component, Trace

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class Band:
    """The bins of K taps used together; rows beyond a tap's own bins carry no weight."""

    turn: Complex
    """(K, B) exp(-iw) with w the bin's angle per sample."""
    frequency_hz: Real
    """(K, B)"""
    count: Real
    """(K, 1) samples transformed."""
    rate_hz: Real
    """(K, 1)"""
    weight: Real
    """(K, B) one over the standard deviation of a real or imaginary part; 0 outside."""
    data: Complex
    """(K, B)"""

    @property
    def rows(self) -> int:
        """Real data in use."""
        return 2 * int(np.count_nonzero(self.weight))


def band(traces: Sequence[Trace], low_hz: float, high_hz: float, duration_s: float) -> Band:
    """Bins from low to high of the first ``duration_s`` of every tap."""
    counts = [min(len(t.samples), max(int(duration_s * t.rate_hz), 16)) for t in traces]
    edges = [bin_edges(t, n, low_hz, high_hz) for t, n in zip(traces, counts, strict=True)]
    widest = max(b - a for a, b in edges)
    shape = (len(traces), widest)
    frequency, weight, data = np.zeros(shape), np.zeros(shape), np.zeros(shape, complex)
    for k, (trace, n, (a, b)) in enumerate(zip(traces, counts, edges, strict=True)):
        frequency[k] = (a + np.arange(widest)) * trace.rate_hz / n
        data[k, : b - a] = trace.spectrum(n)[a:b]
        density = trace.noise.at(frequency[k, : b - a])
        weight[k, : b - a] = 1 / np.sqrt(density * trace.rate_hz * n / 4)
    rate = np.array([[t.rate_hz] for t in traces])
    count = np.array([[float(n)] for n in counts])
    turn = np.exp(-2j * np.pi * frequency / rate)
    return Band(turn, frequency, count, rate, weight, data)


def bin_edges(trace: Trace, count: int, low_hz: float, high_hz: float) -> tuple[int, int]:
    """First bin and one past the last; 0 Hz and half the rate are left out."""
    spacing = trace.rate_hz / count
    first = max(1, int(np.ceil(low_hz / spacing)))
    last = min((count - 1) // 2, int(high_hz / spacing))
    return first, max(last + 1, first)


def subtract(bins: Band, parts: Sequence[Component]) -> Band:
    """The band with components taken out at their present amplitudes."""
    data = bins.data
    for part in parts:
        data = data - part_transform(bins, part)
    return replace(bins, data=data)


def part_transform(bins: Band, part: Component) -> Complex:
    """(K, B) transform of a component as it stands."""
    plain, ramp = conjugate_pair(bins, part.poles)
    total = weighted_pair(plain, part.amplitudes)
    return total + weighted_pair(ramp, part.slopes) if np.any(part.slopes) else total


def conjugate_pair(bins: Band, poles: Complex) -> tuple[list[Complex], list[Complex]]:
    """Transforms of exp(pt) / 2 and of its conjugate's, then the same times t; each (K, B)."""
    plain, ramp = [], []
    for pole in (poles, np.conj(poles)):
        step = np.exp(pole[:, None] / bins.rate_hz)
        last = np.exp(pole[:, None] / bins.rate_hz * bins.count)
        sums = geometric(step * bins.turn, last, bins.count)
        plain.append(sums[0] / 2)
        ramp.append(sums[1] / (2 * bins.rate_hz))
    return plain, ramp


def weighted_pair(pair: Sequence[Complex], amplitudes: Complex) -> Complex:
    """(K, B) transform of Re[a exp(pt)] from the transforms of both conjugates."""
    return amplitudes[:, None] * pair[0] + np.conj(amplitudes)[:, None] * pair[1]


def cosine_sine(pair: Sequence[Complex]) -> list[Complex]:
    """Transforms of Re[exp(pt)] and of Re[i exp(pt)]."""
    return [pair[0] + pair[1], 1j * (pair[0] - pair[1])]


def passive_columns(bins: Band, part: Component) -> list[Complex]:
    """Columns of a component with a fixed pole; a tone has two more, times t, for its wander."""
    plain, ramp = conjugate_pair(bins, part.poles)
    return cosine_sine(plain) + (cosine_sine(ramp) if part.steady else [])


def pole_slopes(ramp: Sequence[Complex], part: Component, amplitudes: Complex) -> list[Complex]:
    """(K, B) derivatives by angular frequency and, unless steady, by ln decay."""
    by_frequency = weighted_pair(ramp, 1j * amplitudes)
    by_decay = -part.decay_per_s * weighted_pair(ramp, amplitudes)
    return [by_frequency] if part.steady else [by_frequency, by_decay]


def real_rows(bins: Band, columns: Sequence[Complex]) -> Real:
    """(K, 2 B, C) weighted real and imaginary parts of columns of (K, B)."""
    stacked = np.stack(columns, axis=-1) * bins.weight[:, :, None]
    return np.concatenate([stacked.real, stacked.imag], axis=1)


def leftover_columns(bins: Band, terms: int) -> list[Complex]:
    """Smooth complex background of the band: Legendre polynomials of frequency, and i times each.

    What is short in time, such as the foot of the contact pulse, is smooth in frequency.
    """
    if terms == 0:
        return []
    used = bins.frequency_hz[bins.weight > 0]
    middle, half = (used.max() + used.min()) / 2, max(np.ptp(used) / 2, 1e-12)
    x = (bins.frequency_hz - middle) / half
    legendre = np.polynomial.legendre.legvander(x, terms - 1)
    scale = np.abs(bins.weight).max(axis=1, initial=0.0)[:, None]
    smooth = [legendre[:, :, i] / scale + 0j for i in range(terms)]
    return smooth + [1j * column for column in smooth]


def orthonormal(rows: Real) -> Real:
    """(K, R, C) orthonormal basis of each tap's columns."""
    size = np.linalg.norm(rows, axis=1, keepdims=True)
    return np.asarray(np.linalg.qr(rows / np.where(size > 0, size, 1.0))[0])
