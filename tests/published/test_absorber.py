"""The tuned absorber: tuning, damping and peak as published, and the peak by scipy.

J. P. Den Hartog, Mechanical Vibrations, harmonic force on the main mass: tuning and damping found
on an open teaching page, the peak from memory.
"""

import math

import numpy as np
import pytest
import scipy.signal

from fieldkit.detune.absorber import own_damping, response, tuning

TUNED = {
    # mass ratio: f_a/f, damping on the main mass's frequency, on the absorber's own; to 5 places
    0.01: (0.99010, 0.06033, 0.06093),
    0.02: (0.98039, 0.08407, 0.08575),
    0.05: (0.95238, 0.12727, 0.13363),
    0.10: (0.90909, 0.16785, 0.18464),
    0.20: (0.83333, 0.20833, 0.25000),
}
PEAKS = {0.01: 14.177, 0.02: 10.050, 0.05: 6.403, 0.10: 4.583, 0.20: 3.317}
"""sqrt(1 + 2/mu)"""
SWEPT = {0.02: 10.053, 0.05: 6.408, 0.10: 4.590}
"""The largest value of a sweep, computed apart from the package."""
LINES_HZ = np.linspace(5.0, 20.0, 20_001)


def swept_peak(mass_ratio):
    """Largest amplification of an undamped main mass of 1 kg at 10 Hz."""
    omega = 2 * np.pi * 10.0 * tuning(mass_ratio)
    damper = 2 * own_damping(mass_ratio) * mass_ratio * omega
    absorber = (mass_ratio, mass_ratio * omega**2, damper)
    return response(LINES_HZ, np.array(10.0), 0.0, np.array(1.0), absorber)[0].max()


@pytest.mark.parametrize("mass_ratio", TUNED)
def test_tuning_and_damping(mass_ratio):
    """Both forms of the damping: with (1 + mu)^3 it is referred to the main mass's frequency."""
    frequency, on_main, on_own = TUNED[mass_ratio]
    assert tuning(mass_ratio) == pytest.approx(frequency, abs=6e-6)
    assert own_damping(mass_ratio) == pytest.approx(on_own, abs=6e-6)
    assert own_damping(mass_ratio) * tuning(mass_ratio) == pytest.approx(on_main, abs=6e-6)


@pytest.mark.parametrize("mass_ratio", PEAKS)
def test_peak_is_the_published_one(mass_ratio):
    """sqrt(1 + 2/mu), which the optimum damping exceeds by less than 0.4 %."""
    assert swept_peak(mass_ratio) == pytest.approx(PEAKS[mass_ratio], rel=4e-3)
    assert swept_peak(mass_ratio) >= 0.9999 * PEAKS[mass_ratio]


@pytest.mark.parametrize("mass_ratio", SWEPT)
def test_peak_is_the_swept_one(mass_ratio):
    """Within 0.05 % of another sweep of the same two equations."""
    assert swept_peak(mass_ratio) == pytest.approx(SWEPT[mass_ratio], rel=5e-4)


@pytest.mark.parametrize("mass_ratio", [0.05, 0.2])
def test_response_is_that_of_two_masses_by_scipy(mass_ratio):
    """scipy's frequency response of the pair's polynomials, 1 % of damping on the main mass."""
    omega, omega_a = 2 * np.pi * 10.0, 2 * np.pi * 10.0 * tuning(mass_ratio)
    k, ka = omega**2, mass_ratio * omega_a**2
    c, ca = 2 * 0.01 * omega, 2 * own_damping(mass_ratio) * mass_ratio * omega_a
    small, link = [mass_ratio, ca, ka], [ca, ka]
    main = [1.0, c + ca, k + ka]
    determinant = np.polysub(np.polymul(main, small), np.polymul(link, link))
    lines = np.linspace(6.0, 15.0, 200)
    expected = k * np.abs(scipy.signal.freqs(small, determinant, 2 * np.pi * lines)[1])
    absorber = (mass_ratio, ka, ca)
    found = response(lines, np.array(10.0), 0.01, np.array(1.0), absorber)[0]
    assert found == pytest.approx(expected, rel=1e-6)


def test_lighter_absorbers_leave_higher_peaks():
    """Den Hartog's peak is of one mass: sqrt(1 + 2/mu) falls as 1/sqrt(mu) for light absorbers."""
    ratio = swept_peak(0.005) / swept_peak(0.02)
    assert ratio == pytest.approx(math.sqrt((1 + 2 / 0.005) / (1 + 2 / 0.02)), rel=2e-3)
