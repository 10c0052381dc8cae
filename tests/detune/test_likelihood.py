"""The sum over alignments against brute-force enumeration."""

from __future__ import annotations

from itertools import combinations

import numpy as np
import pytest

from fieldkit.detune.likelihood import MODEL_ERROR, Peaks, align, detection

RATES = np.array([0.06, 0.5, 0.06, 0.2])


def enumerated(peaks, frequency, detected):
    """Every order-preserving matching of peaks to modes, one by one."""
    total = 0.0
    shares = np.zeros((len(peaks.frequency_hz), len(frequency)))
    for size in range(min(len(peaks.frequency_hz), len(frequency)) + 1):
        for chosen in combinations(range(len(peaks.frequency_hz)), size):
            for taken in combinations(range(len(frequency)), size):
                left = [i for i in range(len(peaks.frequency_hz)) if i not in chosen]
                weight = np.prod(peaks.false_rate[left] / peaks.highest_hz)
                weight *= np.prod(
                    [1 - detected[n] for n in range(len(frequency)) if n not in taken]
                )
                for i, n in zip(chosen, taken, strict=True):
                    variance = peaks.sd_hz[i] ** 2 + (MODEL_ERROR * frequency[n]) ** 2
                    misfit = peaks.frequency_hz[i] - frequency[n]
                    density = np.exp(-0.5 * misfit**2 / variance) / np.sqrt(2 * np.pi * variance)
                    weight *= detected[n] * density
                total += weight
                for i, n in zip(chosen, taken, strict=True):
                    shares[i, n] += weight
    return np.log(total), shares / total


@pytest.mark.parametrize("seed", range(8))
def test_the_recursion_equals_enumeration(seed):
    rng = np.random.default_rng(seed)
    frequency = np.sort(rng.uniform(8, 60, 5))
    measured = np.sort(np.concatenate([frequency[[0, 2, 3]] * 1.004, rng.uniform(8, 60, 1)]))
    peaks = Peaks(measured, np.full(4, 0.05), "vertical", "tapped", 80.0, RATES)
    detected = rng.uniform(0.05, 0.9, 5)
    found = align(peaks, frequency[None], detected[None])
    log_total, shares = enumerated(peaks, frequency, detected)
    assert found.log_likelihood[0] == pytest.approx(log_total, rel=1e-9)
    assert found.responsibility[0] == pytest.approx(shares, abs=1e-9)


def test_a_false_peak_belongs_to_nothing():
    peaks = Peaks(np.array([20.0, 33.0]), np.full(2, 0.02), "vertical", "tapped", 80.0, RATES[:2])
    found = align(peaks, np.array([[20.05, 55.0]]), np.full((1, 2), 0.8))
    assert found.responsibility[0, 0, 0] > 0.99
    assert found.responsibility[0, 1].sum() < 1e-3


def test_a_mode_across_the_sensor_or_above_the_range_is_hardly_expected():
    along, across, above = detection(
        np.array([[1.0, 0.0, 1.0]]), np.array([[20.0, 20.0, 200.0]]), 100.0
    )[0]
    assert along > 0.9
    assert across < 0.1
    assert above < 1e-3
