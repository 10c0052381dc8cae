"""Decays that are not exactly exponential, products of distortion, humps of the background."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from fieldkit.signal.modes import ModeEstimate, TapRecord, estimate_modes

RATE_HZ = 2400.0
NOISE_RMS = 1e-4
STRONG = (60.0, 4e-3, 1.0)
"""Frequency, damping ratio, amplitude."""


def decay(frequency_hz: float, zeta: float, amplitude: float, phase: float = 0.3) -> NDArray:
    """Four seconds of a damped cosine."""
    time_s = np.arange(int(4 * RATE_HZ)) / RATE_HZ
    omega = 2 * np.pi * frequency_hz
    return amplitude * np.exp(-zeta * omega * time_s) * np.cos(omega * time_s + phase)


def in_a_room(seed: int) -> NDArray:
    """The strong mode, and 60 answers of a room about it that die away faster, 40 dB under it."""
    rng = np.random.default_rng(seed)
    whole = decay(*STRONG)
    for _ in range(60):
        near_hz = STRONG[0] + 6 * rng.standard_cauchy()
        if 1 < abs(near_hz) < 200:
            whole += decay(abs(near_hz), 6 / (2 * np.pi * STRONG[0]), 0.01, rng.uniform(0, 6))
    return whole


def heard(*taps: NDArray, seed: int = 1) -> ModeEstimate:
    """What is made of taps in white noise after four quiet seconds."""
    rng = np.random.default_rng(seed)
    quiet = NOISE_RMS * rng.standard_normal(int(4 * RATE_HZ))
    noisy = [tap + NOISE_RMS * rng.standard_normal(len(tap)) for tap in taps]
    return estimate_modes([TapRecord(tap, RATE_HZ, quiet) for tap in noisy])


@pytest.mark.parametrize("seed", range(4))
def test_mode_in_a_room_has_no_satellites(seed: int) -> None:
    """One mode, where it is, within three of its standard deviations, and little beside it."""
    estimate = heard(in_a_room(seed))
    near = [m for m in estimate.modes if abs(m.frequency_hz / STRONG[0] - 1) < 0.1]
    (mode,) = near
    assert abs(mode.frequency_hz - STRONG[0]) < 3 * mode.frequency_sd_hz
    assert mode.damping_ratio is not None
    assert mode.damping_sd is not None
    assert abs(mode.damping_ratio - STRONG[1]) < 3 * mode.damping_sd
    assert len(estimate.modes) <= 3


def test_room_makes_the_mode_less_sure() -> None:
    """Its frequency is stated ten times less exactly than that of the same mode without a room."""
    (dry,) = heard(decay(*STRONG)).modes
    wet = max(heard(in_a_room(2)).modes, key=lambda m: m.strength)
    assert wet.frequency_sd_hz > 10 * dry.frequency_sd_hz


@pytest.mark.parametrize("apart", [0.012, 0.05])
def test_weak_neighbour_of_a_clean_mode_is_kept(apart: float) -> None:
    """30 dB weaker and a few per cent away: a mode, where the strong one is exactly exponential."""
    second_hz = STRONG[0] * (1 + apart)
    estimate = heard(decay(*STRONG) + decay(second_hz, 4e-3, 0.03, 2.0))
    assert [m.frequency_hz for m in estimate.modes] == [
        pytest.approx(STRONG[0], abs=1e-2),
        pytest.approx(second_hz, abs=2e-2),
    ]


def test_product_of_distortion_is_no_mode() -> None:
    """A sensor that adds a thousandth of the square: refused, and the two frequencies told."""
    linear = decay(*STRONG) + decay(41.0, 6e-3, 0.8, 1.0)
    estimate = heard(linear + 3e-3 * linear**2)
    assert [m.frequency_hz for m in estimate.modes] == pytest.approx([41.0, 60.0], abs=0.01)
    reasons = {round(r.frequency_hz): r.reason for r in estimate.refused}
    assert "60 + 60 Hz" in reasons[120]
    assert "60 + 41.001 Hz" in reasons[101]
    assert "60 - 41.001 Hz" in reasons[19]
    assert all("distortion" in reasons[at] for at in (19, 82, 101, 120))


def test_mode_at_twice_another_is_kept() -> None:
    """An octave apart, but with a decay of its own."""
    estimate = heard(decay(*STRONG) + decay(120.0, 12e-3, 0.02))
    assert [round(m.frequency_hz) for m in estimate.modes] == [60, 120]


@pytest.mark.parametrize("seed", range(3))
def test_hump_of_the_background_is_no_mode(seed: int) -> None:
    """Narrow noise of a machine whose speed moves stands in the quiet time as in the tap."""
    rng = np.random.default_rng(seed)
    count = int(10 * RATE_HZ)
    frequency_hz = np.fft.rfftfreq(count, 1 / RATE_HZ)
    shape = 1 + 20 * np.exp(-0.5 * ((frequency_hz - 33) / 0.5) ** 2)
    noise = np.fft.irfft(shape * np.fft.rfft(rng.standard_normal(count)), count) * 1e-3
    quiet, after = np.split(noise, [int(6 * RATE_HZ)])
    tap = after + decay(*STRONG)[: len(after)]
    (mode,) = estimate_modes([TapRecord(tap, RATE_HZ, quiet)]).modes
    assert mode.frequency_hz == pytest.approx(STRONG[0], abs=0.01)
