"""Short filters in blocks and medians against numpy's own."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.filtering import filtered, median, medians


@pytest.mark.parametrize("count", [1, 5, 31, 32, 33, 1000])
@pytest.mark.parametrize("order", [1, 2, 13, 41, 50])
def test_filtering_in_blocks_is_a_convolution(count: int, order: int) -> None:
    """Any length of signal and of filter gives the first part of numpy's convolution."""
    rng = np.random.default_rng(count + order)
    samples, weights = rng.normal(size=count), rng.normal(size=order)
    assert filtered(samples, weights) == pytest.approx(np.convolve(samples, weights)[:count])


@pytest.mark.parametrize("count", [1, 2, 3, 10, 11])
def test_median_of_odd_and_even_counts(count: int) -> None:
    """The same value as numpy's median."""
    values = np.random.default_rng(count).normal(size=count)
    assert median(values) == np.median(values)


@pytest.mark.parametrize("width", [1, 2, 5, 34])
def test_medians_of_rows(width: int) -> None:
    """The same values as numpy's medians along the rows."""
    rows = np.random.default_rng(width).normal(size=(7, width))
    assert medians(rows) == pytest.approx(np.median(rows, axis=1), rel=0, abs=0)
