"""The transform bins around some poles, for all taps, and the columns a model has there.

Every bin is divided by the standard deviation noise gives its real or imaginary part. Columns of a
model are complex, (C, K, B); as rows of real data they are (K, C, 2 B).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.decays import geometric
from fieldkit.signal.traces import Component, Trace, unbent

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_NEARLY = 0.99
"""Of the longest tap's samples: so few left out of the others' ends tell nothing more."""


@dataclass(frozen=True)
class Band:
    """The bins of K taps used together; rows beyond a tap's own bins carry no weight."""

    turn: Complex
    """(K, B) exp(-iw) with w the bin's angle per sample; (1, B) where all taps have the same."""
    count: Real
    """(K, 1) samples transformed; (1, 1) where all taps have the same."""
    rate_hz: Real
    """(K, 1), or (1, 1) likewise."""
    frequency_hz: Real
    """(K, B)"""
    weight: Real
    """(K, B) one over the standard deviation of a real or imaginary part; 0 outside."""
    data: Complex
    """(K, B) weighted transforms."""

    @property
    def taps(self) -> int:
        """K."""
        return len(self.weight)

    @property
    def rows(self) -> int:
        """Real data in use."""
        return 2 * int(np.count_nonzero(self.weight))

    @cached_property
    def edges_hz(self) -> tuple[float, float]:
        """Frequencies between which a pole can be seen: from a bin below the lowest to the highest.

        Beyond the highest there may be no bin at all, for nothing is analysed above the region.
        """
        used = self.frequency_hz[self.weight > 0]
        spacing = float(np.max(self.rate_hz / self.count))
        return float(used.min()) - spacing, float(used.max())


def band(
    traces: Sequence[Trace],
    low_hz: float,
    high_hz: float,
    duration_s: float,
    enough_s: float = np.inf,
) -> Band:
    """Bins from low to high of about the first ``duration_s`` of every tap.

    Where every tap lasts ``enough_s``, all are cut to the shortest.
    """
    counts = alike_where_enough([t.fast_count(duration_s) for t in traces], traces, enough_s)
    edges = [bin_edges(t, n, low_hz, high_hz) for t, n in zip(traces, counts, strict=True)]
    widest = max(b - a for a, b in edges)
    shape = (len(traces), widest)
    frequency, weight, data = np.zeros(shape), np.zeros(shape), np.zeros(shape, complex)
    for k, (trace, n, (a, b)) in enumerate(zip(traces, counts, edges, strict=True)):
        frequency[k] = (a + np.arange(widest)) * trace.rate_hz / n
        density = trace.noise.at(frequency[k, : b - a])
        weight[k, : b - a] = 1 / np.sqrt(density * trace.rate_hz * n / 4)
        data[k, : b - a] = trace.spectrum(n)[a:b] * weight[k, : b - a]
    alike = len({(t.rate_hz, n) for t, n in zip(traces, counts, strict=True)}) == 1
    used = slice(0, 1 if alike else None)
    rate = np.array([[t.rate_hz] for t in traces])[used]
    count = np.array([[float(n)] for n in counts])[used]
    turn = np.exp(-2j * np.pi * frequency[used] / rate)
    return Band(turn, count, rate, frequency, weight, data)


def alike_where_enough(
    counts: Sequence[int], traces: Sequence[Trace], enough_s: float
) -> list[int]:
    """Samples of each tap to transform: the least for all where hardly anything is lost by it.

    Taps with the same bins share the transforms of a model.
    """
    least, rate_hz = min(counts), max(t.rate_hz for t in traces)
    enough = min(_NEARLY * max(counts), enough_s * rate_hz)
    return [least] * len(counts) if least >= enough else list(counts)


def bin_edges(trace: Trace, count: int, low_hz: float, high_hz: float) -> tuple[int, int]:
    """First bin and one past the last; 0 Hz and half the rate are left out."""
    spacing = trace.rate_hz / count
    first = max(1, int(np.ceil(low_hz / spacing)))
    last = min((count - 1) // 2, int(high_hz / spacing))
    return first, max(last + 1, first)


def subtract(bins: Band, parts: Sequence[Component]) -> Band:
    """The band with components taken out at their present amplitudes."""
    if not parts:
        return bins
    parts = [plain for part in parts for plain in unbent(part)]
    plain, ramp = transforms(bins, pole_table(parts))
    amplitudes = np.array([p.amplitudes for p in parts])[:, :, None]
    total = combined(plain, amplitudes).sum(axis=0)
    sloping = [i for i, p in enumerate(parts) if np.any(p.slopes)]
    if sloping:
        slopes = np.array([parts[i].slopes for i in sloping])[:, :, None]
        total = total + combined(ramp[sloping], slopes).sum(axis=0)
    return replace(bins, data=bins.data - total)


def pole_table(parts: Sequence[Component]) -> Complex:
    """(P, K) poles, or (P, 1) where all taps share them."""
    poles = np.array([p.poles for p in parts])
    return poles[:, :1] if np.all(poles == poles[:, :1]) else poles


def transforms(bins: Band, poles: Complex) -> tuple[Complex, Complex]:
    """Weighted transforms of exp(pt) / 2 and of its conjugate, and both times t; (P, 2, K, B).

    ``poles`` are (P, K), or (P, 1) where the taps share them.
    """
    plain, ramp = unweighted(bins, poles)
    return plain * (bins.weight / 2), ramp * (bins.weight / (2 * bins.rate_hz))


def unweighted(bins: Band, poles: Complex) -> tuple[Complex, Complex]:
    """Sums of exp(pt) and of its conjugate over the samples, and both times the sample's number.

    (P, 2, K, B), or (P, 2, 1, B) where all taps have the same bins and share the poles.
    """
    both = np.stack([poles, np.conj(poles)], axis=1)[..., None] / bins.rate_hz
    return geometric(np.exp(both) * bins.turn, np.exp(both * bins.count), bins.count)


def combined(pair: Complex, amplitudes: Complex) -> Complex:
    """(P, K, B) transforms of Re[a exp(pt)] from both conjugates; amplitudes are (P, K, 1)."""
    return np.asarray(amplitudes * pair[:, 0] + np.conj(amplitudes) * pair[:, 1])


def cosines_sines(pair: Complex) -> Complex:
    """(2 P, K, B) transforms of Re[exp(pt)] and of Re[i exp(pt)] in turn."""
    columns = np.empty_like(pair)
    np.add(pair[:, 0], pair[:, 1], out=columns[:, 0])
    np.subtract(pair[:, 0], pair[:, 1], out=columns[:, 1])
    columns[:, 1] *= 1j
    return columns.reshape(-1, *pair.shape[2:])


def passive_columns(bins: Band, parts: Sequence[Component]) -> Complex:
    """Columns of components with fixed poles; a tone has two more, times t, for its wander."""
    if not parts:
        return np.zeros((0, *bins.weight.shape), complex)
    plain, ramp = transforms(bins, pole_table(parts))
    each = [
        columns
        for i, part in enumerate(parts)
        for columns in [plain[i : i + 1]] + ([ramp[i : i + 1]] if part.steady else [])
    ]
    return cosines_sines(np.concatenate(each))


def real_rows(columns: Complex) -> Real:
    """(K, C, 2 B) real and imaginary parts, in turn, of columns of (C, K, B)."""
    return np.ascontiguousarray(columns.transpose(1, 0, 2)).view(np.float64)


def leftover_columns(bins: Band, terms: int) -> Complex:
    """Smooth complex background of the band: Legendre polynomials of frequency, and i times each.

    What is short in time, such as the foot of the contact pulse, is smooth in frequency.
    """
    if terms == 0:
        return np.zeros((0, *bins.weight.shape), complex)
    used = bins.frequency_hz[bins.weight > 0]
    middle, half = (used.max() + used.min()) / 2, max(np.ptp(used) / 2, 1e-12)
    legendre = np.polynomial.legendre.legvander((bins.frequency_hz - middle) / half, terms - 1)
    scale = np.abs(bins.weight).max(axis=1, initial=0.0)[:, None]
    smooth = np.moveaxis(legendre, -1, 0) * (bins.weight / scale)
    return np.concatenate([smooth + 0j, 1j * smooth])
