"""Short filters and medians of long recordings, by what takes least time."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Real = NDArray[np.float64]

_LEAST_BLOCK = 32


def filtered(samples: Real, weights: Real) -> Real:
    """(n,) sums of each sample and those before it, times weights (m,), the latest first.

    In blocks, so that one product of matrices does the work; before the first sample stand zeros.
    """
    count, order = len(samples), len(weights)
    block = max(_LEAST_BLOCK, order)
    rows = -(-count // block)
    padded = np.zeros((rows + 1) * block)
    padded[block : block + count] = samples
    pairs = np.lib.stride_tricks.sliding_window_view(padded, 2 * block)[::block]
    shift = block + np.arange(block) - np.arange(2 * block)[:, None]
    inside = (shift >= 0) & (shift < order)
    toeplitz = np.where(inside, weights[np.clip(shift, 0, order - 1)], 0.0)
    return np.asarray((pairs @ toeplitz).ravel()[:count])


def medians(rows: Real) -> Real:
    """(n,) medians of (n, m) rows, m at least 1 and no value NaN."""
    half = rows.shape[1] // 2
    ranked = np.partition(rows, half, axis=1)
    if rows.shape[1] % 2:
        return np.asarray(ranked[:, half])
    return np.asarray((ranked[:, :half].max(axis=1) + ranked[:, half]) / 2)


def median(values: Real) -> float:
    """Median of (n,) values, n at least 1 and none of them NaN."""
    half = len(values) // 2
    ranked = np.partition(values, half)
    if len(values) % 2:
        return float(ranked[half])
    return float((ranked[:half].max() + ranked[half]) / 2)
