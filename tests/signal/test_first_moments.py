"""Decays of a few cycles count as ringing; what excites nothing does not."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.first_moments import first_moments
from fieldkit.signal.innovation import Level
from fieldkit.signal.modes import estimate_modes
from fieldkit.signal.ringing import RINGS
from fieldkit.signal.taps import cut, find_taps
from tests.signal.made_taps import Blow, Made, coloured, tap_recording

RATE_HZ = 4000.0
RUBBERY = Made(74.0, 0.094, 1.0)


def test_taps_on_a_rubbery_line_are_used() -> None:
    """A decay over in 70 ms gives its mode, though no quarter of a second shows it."""
    blows = [Blow(2.5 + 2.3 * i, s, 0.0015) for i, s in enumerate((1.0, 0.9, 1.1, 0.8))]
    clean = tap_recording((RUBBERY,), blows, 12.0, RATE_HZ)
    signal = clean + coloured(np.random.default_rng(4), len(clean), RATE_HZ, 2.5e-3, 0.0)
    search = find_taps(signal, RATE_HZ, full_scale=None)
    assert [t.usable for t in search.taps] == [True] * 4
    (mode,) = estimate_modes(cut(signal, RATE_HZ, search), high_hz=400.0).modes
    assert mode.frequency_hz == pytest.approx(RUBBERY.frequency_hz, rel=0.02)
    assert mode.damping_ratio == pytest.approx(RUBBERY.damping_ratio, rel=0.15)


@pytest.mark.parametrize("exponent", [0.0, 1.0])
def test_noise_hardly_ever_reaches_the_threshold(exponent: float) -> None:
    """None of 300 moments of noise, white or pink, looks like a decay."""
    noise = coloured(np.random.default_rng(5), 160000, RATE_HZ, 1e-3, exponent)
    firsts = first_moments(Level(noise, RATE_HZ), 400.0, (0.0, 3.0))
    assert max(firsts.over(4.0 + 0.11 * i, 40.0) for i in range(300)) < RINGS


def test_too_short_a_background_judges_nothing() -> None:
    noise = np.random.default_rng(6).standard_normal(8000)
    firsts = first_moments(Level(noise, RATE_HZ), 400.0, (0.0, 0.1))
    assert firsts.over(1.0, 2.0) == 0.0
