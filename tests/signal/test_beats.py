"""A decay is followed below the steady lines that stand over it."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.beats import beats
from fieldkit.signal.modes import estimate_modes
from fieldkit.signal.taps import cut, find_taps
from tests.signal.made_taps import Blow, Made, coloured, tap_recording

RATE_HZ = 2000.0
ORDERS_HZ = (3.05, 6.1, 9.15)
"""Two orders of a slow machine lie in one short-time bin and beat there."""
SLOW = Made(3.53, 0.027, 0.03)
FAST = Made(153.0, 0.02, 1.0)


def beside_machine(modes: tuple[Made, ...], seed: int) -> np.ndarray:
    """Three blows 9 s apart beside a machine whose every order is far above the slow mode."""
    blows = [Blow(3.0 + 9.0 * i, s, 0.002) for i, s in enumerate((1.0, 0.8, 1.1))]
    clean = tap_recording(modes, blows, 30.0, RATE_HZ)
    time_s = np.arange(len(clean)) / RATE_HZ
    machine = sum(0.1 * np.cos(2 * np.pi * f * time_s + f) for f in ORDERS_HZ)
    return clean + machine + coloured(np.random.default_rng(seed), len(clean), RATE_HZ, 1e-4, 0.0)


def test_slow_mode_under_the_orders_of_a_machine_is_found() -> None:
    """Its decay is cut as long as it moves the lines, and so told from them."""
    signal = beside_machine((SLOW, FAST), 1)
    search = find_taps(signal, RATE_HZ, full_scale=None)
    assert [t.usable for t in search.taps] == [True, True, True]
    assert all(t.end - t.start > 3.5 * RATE_HZ for t in search.taps)
    found = estimate_modes(cut(signal, RATE_HZ, search), high_hz=400.0).modes
    slow, fast = found
    assert slow.frequency_hz == pytest.approx(SLOW.frequency_hz, abs=0.005)
    assert fast.frequency_hz == pytest.approx(FAST.frequency_hz, abs=0.05)


def test_lines_alone_lengthen_no_tap() -> None:
    """Where nothing rings beside the lines, a tap ends where its own ringing does."""
    search = find_taps(beside_machine((FAST,), 2), RATE_HZ, full_scale=None)
    assert [t.usable for t in search.taps] == [True, True, True]
    assert all(t.end - t.start < 2.5 * RATE_HZ for t in search.taps)


def test_noise_beats_with_nothing() -> None:
    """Without a line, and without enough background, there is nothing to stray."""
    samples = np.random.default_rng(3).standard_normal(20000)
    starts = np.arange(0, 20000, 125)
    assert not np.any(beats(samples, RATE_HZ, starts, (0.0, 5.0)))
    samples += 10 * np.cos(2 * np.pi * 50 * np.arange(20000) / RATE_HZ)
    assert np.any(beats(samples, RATE_HZ, starts, (0.0, 5.0)))
    assert not np.any(beats(samples, RATE_HZ, starts, (0.0, 1.0)))
