"""Modal constants of known poles from a measured response, against the modes it was made of."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.signal.modal_response import FittedResponse, fit_response
from fieldkit.signal.modes import MeasuredMode
from fieldkit.signal.response import FrequencyResponse, Struck, as_quantity, frequency_response
from tests.signal.made_blows import HalfSine, Vibrating, accelerance, two_channels

RATE_HZ = 8192.0
MODES = (
    Vibrating(22.0, 0.012, 1 / 40),
    Vibrating(57.0, 0.01, 1 / 25),
    Vibrating(62.0, 0.015, -1 / 60),
)


def measured(
    modes: tuple[Vibrating, ...], *, blows: int = 3, ring_s: float = 6.0, noise: float = 0.0,
    seed: int = 0,
) -> FrequencyResponse:  # fmt: skip
    """Accelerance of blows whose records last ``ring_s`` after the hit."""
    struck = []
    for i in range(blows):
        hit = HalfSine(0.01, 60.0 + 20.0 * i)
        force, response = two_channels(
            modes, [hit], ring_s + 0.012, RATE_HZ, noise_m_per_s2=noise, seed=seed + i
        )
        struck.append(Struck(force, response, ring_s))
    return frequency_response(
        struck, RATE_HZ, high_hz=300.0, quantity="acceleration", scale=1.0, force_scale=1.0
    )


def poles(modes: tuple[Vibrating, ...], damping_sd: float = 0.0) -> list[MeasuredMode]:
    return [
        MeasuredMode(m.frequency_hz, 0.0, m.damping_ratio, damping_sd * m.damping_ratio)
        for m in modes
    ]


def fitted(response: FrequencyResponse, modes: tuple[Vibrating, ...] = MODES) -> FittedResponse:
    return fit_response(response, poles(modes), low_hz=2.0, high_hz=200.0)


def test_modal_constants_are_those_of_the_modes() -> None:
    """Two close modes among them, one with sensor and hammer moving against each other."""
    found = fitted(measured(MODES))
    for mode, made in zip(found.modes, MODES, strict=True):
        assert mode.modal_constant == pytest.approx(made.constant, rel=2e-3)
        assert abs(mode.skew) < 2e-3 * abs(made.constant)
    assert found.misfit < 3e-3


def test_the_curve_is_the_exact_response() -> None:
    """Also between the modes, where no line was fitted."""
    found = fitted(measured(MODES))
    frequency_hz = np.linspace(15.0, 90.0, 400)
    exact = accelerance(MODES, frequency_hz)
    assert np.abs(found.at(frequency_hz) - exact).max() < 2e-3 * np.abs(exact).max()
    assert np.median(np.abs(found.at(frequency_hz) / exact - 1)) < 0.01


@pytest.mark.parametrize("quantity", ["mobility", "receptance"])
def test_the_constants_are_the_same_in_each_quantity(quantity: str) -> None:
    found = fitted(as_quantity(measured(MODES, noise=0.01), quantity))
    for mode, made in zip(found.modes, MODES, strict=True):
        assert mode.modal_constant == pytest.approx(made.constant, rel=5e-3)


@pytest.mark.parametrize("constants", [1.0, 2.0, 4.0])
def test_a_record_cut_short_does_not_change_the_constants(constants: float) -> None:
    """Of a decay recorded for n time constants the peak lacks exp(-n); the fit allows for that."""
    mode = (Vibrating(30.0, 0.01, 1 / 30),)
    response = measured(mode, ring_s=constants / (0.01 * 2 * np.pi * 30.0))
    peak = np.abs(response.h1)[(response.frequency_hz > 28) & (response.frequency_hz < 32)].max()
    assert peak < (1 - 0.8 * np.exp(-constants)) * (1 / 30) / (2 * 0.01)
    assert fitted(response, mode).modes[0].modal_constant == pytest.approx(1 / 30, rel=5e-3)


def test_modes_beyond_the_lines_are_allowed_for() -> None:
    """One below and one above that nobody names: residual terms, not modes."""
    hidden = (Vibrating(6.0, 0.03, 1 / 50), Vibrating(210.0, 0.02, 1 / 10))
    found = fitted(measured((*MODES, *hidden)))
    for mode, made in zip(found.modes, MODES, strict=True):
        assert mode.modal_constant == pytest.approx(made.constant, rel=0.02)


def test_the_doubt_covers_what_noise_does() -> None:
    """Of 60 noisy measurements the true value lies within two standard deviations as often as it
    should, and is not promised far worse than it is."""
    errors, doubts = [], []
    for seed in range(0, 120, 4):
        found = fitted(measured(MODES[:2], ring_s=3.0, noise=0.6, seed=seed), MODES[:2])
        for mode, made in zip(found.modes, MODES, strict=False):
            errors.append((mode.modal_constant - made.constant) / mode.modal_constant_sd)
            doubts.append(mode.modal_constant_sd / made.constant)
    assert np.mean(np.abs(errors) < 2) >= 0.9
    assert 0.3 < np.std(errors) < 1.3
    assert np.median(doubts) < 0.1


def test_the_doubt_of_the_damping_is_passed_on() -> None:
    """At resonance the response is R / (2 zeta); the flanks, which are fitted too, know better."""
    sure = fit_response(measured(MODES), poles(MODES), low_hz=2.0, high_hz=200.0)
    unsure = fit_response(measured(MODES), poles(MODES, 0.05), low_hz=2.0, high_hz=200.0)
    for before, after in zip(sure.modes, unsure.modes, strict=True):
        assert after.modal_constant_sd > 1.3 * before.modal_constant_sd
        assert after.modal_constant_sd < 0.05 * abs(after.modal_constant)


def test_one_blow_is_fitted_too() -> None:
    found = fitted(measured(MODES, blows=1, noise=0.05))
    assert [mode.coherence for mode in found.modes] == [None, None, None]
    for mode, made in zip(found.modes, MODES, strict=True):
        assert mode.modal_constant == pytest.approx(made.constant, rel=0.02)


def test_only_modes_in_the_band_and_with_damping_are_fitted() -> None:
    response = measured(MODES)
    found = fit_response(response, poles(MODES), low_hz=2.0, high_hz=40.0)
    assert [mode.frequency_hz for mode in found.modes] == [22.0]
    typed = [replace(pole, damping_ratio=None) for pole in poles(MODES)]
    with pytest.raises(Refusal, match="no measured mode lies where the force excites"):
        fit_response(response, typed, low_hz=2.0, high_hz=200.0)
    with pytest.raises(Refusal, match="no measured mode"):
        fit_response(response, poles(MODES), low_hz=2.0, high_hz=5.0)
