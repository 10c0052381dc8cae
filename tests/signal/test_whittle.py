"""Spectral likelihood and subspace poles against closed forms and numerical integrals."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.stabilisation import distinct, stabilised
from fieldkit.signal.subspace import bands, poles_by_order
from fieldkit.signal.whittle import (
    Zone,
    finite_lorentzian,
    fit_zone,
    mode_columns,
    spectrum_and_jacobian,
)

POLE = complex(-1.9, 2 * np.pi * 30.0)


def zone(duration_s: float = 60.0) -> Zone:
    """25 to 35 Hz in bins of a record, spectrum still empty."""
    bins = np.arange(int(25 * duration_s), int(35 * duration_s))
    return Zone(bins / duration_s, np.ones(len(bins)), np.ones(len(bins)), duration_s)


@pytest.mark.parametrize("duration_s", [0.4, 3.0, 60.0])
def test_expectation_of_a_periodogram_is_the_transform_of_the_tapered_correlation(
    duration_s: float,
) -> None:
    """Against numerical integration of exp(-s t) (1 - t / T)."""
    from scipy.integrate import quad

    s = complex(1.9, 4.0)
    value, _ = finite_lorentzian(np.array([s]), duration_s)

    def part(t: float) -> complex:
        return complex(np.exp(-s * t) * (1 - t / duration_s))

    end = min(duration_s, 12.0)
    real = quad(lambda t: part(t).real, 0, end, limit=200)[0]
    imaginary = quad(lambda t: part(t).imag, 0, end, limit=200)[0]
    assert value[0] == pytest.approx(complex(real, imaginary), rel=1e-6, abs=1e-9)


def test_long_records_give_the_lorentzian() -> None:
    """Half the height half a bandwidth off the peak."""
    frequency_hz = np.array([30.0, 30.0 + 1.9 / (2 * np.pi)])
    values, _, _ = mode_columns(frequency_hz, POLE, 1e6)
    assert values[1, 0] / values[0, 0] == pytest.approx(0.5, rel=1e-3)


@pytest.mark.parametrize("duration_s", [5.0, 60.0])
def test_derivatives_are_those_of_the_spectrum(duration_s: float) -> None:
    """Against central differences."""
    place = zone(duration_s)
    amplitudes, background = np.array([[2.0, 0.3]]), np.array([0.1, 0.02, 0.01])
    jacobian = spectrum_and_jacobian(place, np.array([POLE]), amplitudes, background, 0.0)[1]

    def spectrum(omega: float, log_decay: float) -> np.ndarray:
        pole = complex(-1.9 * np.exp(log_decay), POLE.imag + omega)
        return spectrum_and_jacobian(place, np.array([pole]), amplitudes, background, 0.0)[0]

    step = 1e-5
    by_omega = (spectrum(step, 0) - spectrum(-step, 0)) / (2 * step)
    by_decay = (spectrum(0, step) - spectrum(0, -step)) / (2 * step)
    assert jacobian[:, 0] == pytest.approx(by_omega, rel=1e-5, abs=1e-7)
    assert jacobian[:, 1] == pytest.approx(by_decay, rel=1e-5, abs=1e-7)


def test_a_spectrum_without_scatter_gives_its_own_parameters_back() -> None:
    """The expectation itself as data, started a third off."""
    place = zone()
    amplitudes, background = np.array([[2.0, 0.3]]), np.array([0.1, 0.02, 0.01])
    power = spectrum_and_jacobian(place, np.array([POLE]), amplitudes, background, 0.0)[0]
    exact = Zone(place.frequency_hz, power, place.weight, place.duration_s)
    fit = fit_zone(exact, [complex(-2.5, 2 * np.pi * 30.1)])
    assert fit.poles[0] == pytest.approx(POLE, rel=1e-3)
    assert fit.amplitudes[0] == pytest.approx([2.0, 0.3], rel=0.05)


def test_subspace_poles_of_an_exact_spectrum_are_stable_and_true() -> None:
    """Three modes, two of them two bandwidths apart, each at most of the orders."""
    truth = [(9.0, 0.01), (41.0, 0.012), (43.0, 0.012)]
    frequency_hz = np.arange(0, 60 * 100) / 60.0
    power = np.full(len(frequency_hz), 1e-3)
    for natural_hz, damping in truth:
        omega = 2 * np.pi * natural_hz
        pole = complex(-damping * omega, omega * np.sqrt(1 - damping**2))
        power += mode_columns(frequency_hz, pole, 60.0)[0][:, 0]
    found = distinct(
        [p for band in bands(3.0, 90.0) for p in stabilised(poles_by_order(power, 1 / 60, band))]
    )
    for natural_hz, damping in truth:
        best = min(found, key=lambda p: abs(p.frequency_hz - natural_hz))
        assert best.stable
        assert best.frequency_hz == pytest.approx(natural_hz, abs=0.3 * damping * natural_hz)
        assert -best.pole.real / abs(best.pole) == pytest.approx(damping, rel=0.3)
