"""The magnification of a mode against its closed form and a general reference library."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.signal import TransferFunction, freqresp

from fieldkit.detune.magnification import magnification

ZETA = (0.002, 0.01, 0.05, 0.2)


@pytest.mark.parametrize("zeta", ZETA)
def test_at_resonance_it_is_one_over_twice_the_damping(zeta):
    """Thomson, Theory of Vibration with Applications, harmonic excitation (from memory)."""
    assert magnification(1.0, zeta) == pytest.approx(1 / (2 * zeta), rel=1e-12)


@pytest.mark.parametrize("zeta", ZETA)
def test_its_peak_lies_where_the_closed_form_says(zeta):
    """r = sqrt(1 - 2 zeta^2) with 1 / (2 zeta sqrt(1 - zeta^2)), the same source."""
    ratio = np.linspace(0.5, 1.5, 400_001)
    times = magnification(ratio, zeta)
    assert ratio[np.argmax(times)] == pytest.approx(np.sqrt(1 - 2 * zeta**2), abs=5e-6)
    assert times.max() == pytest.approx(1 / (2 * zeta * np.sqrt(1 - zeta**2)), rel=1e-5)


def test_without_damping_it_is_one_at_root_two():
    """1 / |1 - r^2|: static at r = 0, one again at sqrt 2."""
    assert magnification(0.0, 0.0) == 1.0
    assert magnification(np.sqrt(2), 0.0) == pytest.approx(1.0)


@pytest.mark.parametrize("zeta", ZETA)
def test_it_is_the_response_of_a_second_order_system(zeta):
    """scipy's frequency response of 1 / (s^2 + 2 zeta s + 1)."""
    ratio = np.array([0.3, 0.8, 0.97, 1.0, 1.05, 1.4, 3.0])
    _, response = freqresp(TransferFunction([1.0], [1.0, 2 * zeta, 1.0]), ratio)
    assert magnification(ratio, zeta) == pytest.approx(np.abs(response), rel=1e-9)
