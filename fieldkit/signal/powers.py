"""A decay whose frequency drifts with its amplitude, as a sum of exponentials on given bins."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.bands import Band, unweighted
from fieldkit.signal.traces import Component

Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class Powers:
    """Transforms of exp(pt) with once, twice, ... its decay: a drifting decay is a sum of them."""

    bins: Band
    plain: Complex
    """(2, K, N, B) of each and of its conjugate; (2, 1, N, B) where all taps have the same bins."""
    ramp: Complex
    """The same of each times t."""

    @classmethod
    def of(cls, bins: Band, part: Component, count: int) -> Powers:
        """So many powers of the component's decay."""
        poles = np.array(part.pole - part.decay_per_s * np.arange(count)[:, None])
        plain, ramp = unweighted(bins, poles)
        return cls(
            bins,
            (plain / 2).transpose(1, 2, 0, 3),
            (ramp / (2 * bins.rate_hz)).transpose(1, 2, 0, 3),
        )

    def enough(self, part: Component, count: int) -> Powers:
        """These, or more where a series has more terms."""
        return self if count <= self.plain.shape[2] else Powers.of(self.bins, part, count)

    def pair(self, weights: Complex) -> Complex:
        """(1, 2, K, B) transforms of the drifting decay of unit amplitude and of its conjugate."""
        own, mirrored = summed(self.plain, weights[None])
        return np.asarray(np.stack([own, mirrored], axis=1) * self.bins.weight)

    def slopes(self, part: Component, weights: Complex, scale: float) -> Complex:
        """(3, K, B) derivatives of the decay by angular frequency, ln decay and scaled drift."""
        weights = part.amplitudes * weights
        turned = 1j * weights
        faster = 1 + np.arange(len(weights))[:, None]
        by_pole = np.stack([turned, -part.decay_per_s * faster * weights])
        by_lead = turned.copy()
        by_lead[1:] -= turned[:-1]
        by_drift = scale * np.abs(part.amplitudes) * by_lead
        moved = [sum(summed(self.ramp, by_pole)), sum(summed(self.plain, by_drift[None]))]
        return np.asarray(np.concatenate(moved) * self.bins.weight)


def summed(table: Complex, weights: Complex) -> tuple[Complex, Complex]:
    """Sums (C, K, B) of a table of powers by weights (C, N, K), and of the conjugates by theirs."""
    rows = weights.transpose(2, 0, 1)
    used = table[:, :, : rows.shape[2]]
    own, mirrored = np.matmul(rows, used[0]), np.matmul(np.conj(rows), used[1])
    return own.transpose(1, 0, 2), mirrored.transpose(1, 0, 2)
