"""Sensitivity on the reference shaker: what it reads, and what it refuses."""

from __future__ import annotations

import datetime
import math

import numpy as np
import pytest

from fieldkit.capture.calibration import REFERENCE_HZ, calibrate, fit_sine
from fieldkit.capture.setup import ChannelSetup
from fieldkit.errors import Refusal

RATE_HZ = 8000
DAY = datetime.date(2025, 3, 4)
FULL_SCALE_V = 1.4


def shaken(
    frequency_hz: float = REFERENCE_HZ,
    rms: float = 10.0,
    *,
    mv_per_g: float = 103.0,
    **faults: float,
) -> np.ndarray:
    """Four seconds of a sensor on a shaker, full scale 1."""
    time_s = np.arange(4 * RATE_HZ) / RATE_HZ
    peak = rms * math.sqrt(2) / 9.80665 * mv_per_g / 1000 / FULL_SCALE_V
    phase = 2 * np.pi * frequency_hz * time_s + 0.4
    swell = 1 + faults.get("swell", 0.0) * np.sin(2 * np.pi * 0.7 * time_s)
    third = faults.get("third", 0.0) * np.sin(3 * phase)
    noise = faults.get("noise", 1e-3) * np.random.default_rng(2).standard_normal(len(time_s))
    return peak * (swell * np.sin(phase) + third) + 0.01 + peak * noise


def test_it_reads_the_sensitivity_that_the_sensor_has() -> None:
    """103 mV/g at 10 m/s^2 rms: a sine of known size is read within a thousandth."""
    found = calibrate(shaken(), RATE_HZ, day=DAY)
    assert found.frequency_hz == pytest.approx(159.1549, abs=1e-3)
    assert found.keys("1.4 V") == {"sensitivity": "103 mV/g", "full_scale": "1.4 V"}
    assert found.si_per_unit == pytest.approx(FULL_SCALE_V / 0.103 * 9.80665, rel=1e-3)
    assert 0.015 <= found.relative_sd < 0.016
    assert "2025-03-04" in found.comment("1.4 V")
    assert "103 mV/g" in found.comment("1.4 V")


def test_a_shaker_of_one_g_gives_the_same() -> None:
    """1 g rms is 9.80665 m/s^2 (exact)."""
    found = calibrate(shaken(rms=9.80665), RATE_HZ, reference_rms=9.80665, day=DAY)
    assert found.keys("1.4 V")["sensitivity"] == "103 mV/g"


def test_without_a_voltage_it_gives_a_scale_that_a_channel_takes() -> None:
    """The text is read back by the set-up of a channel."""
    setup = calibrate(shaken(), RATE_HZ, day=DAY).setup(ChannelSetup(direction="vertical"))
    assert setup.si_per_unit == pytest.approx(FULL_SCALE_V / 0.103 * 9.80665, rel=1e-3)
    assert setup.direction == "vertical"


@pytest.mark.parametrize(
    ("signal", "reason"),
    [
        (shaken(swell=0.02), "level varies"),
        (shaken(80.0), "strongest line is at 80.00 Hz"),
        (shaken(REFERENCE_HZ * 1.011), "the reference shakes at 159.15 Hz"),
        (shaken(third=0.05), "harmonics are 5.0 %"),
        (np.clip(2.0 * shaken() / np.abs(shaken()).max(), -1, 1), "clips"),
        (1e-3 * shaken(), "hardly anything"),
        (shaken(noise=0.1), "over the noise"),
        (shaken()[: 2 * RATE_HZ], "2.0 s were heard"),
    ],
)
def test_it_refuses_with_the_reason(signal: np.ndarray, reason: str) -> None:
    """Unsteady, of another frequency, distorted, clipped, weak, noisy or short."""
    with pytest.raises(Refusal, match=reason):
        calibrate(signal, RATE_HZ)


def test_a_shaker_half_a_percent_off_is_taken() -> None:
    """One percent is allowed."""
    assert calibrate(shaken(REFERENCE_HZ * 1.005), RATE_HZ).frequency_hz > 159.9


def test_the_fit_finds_the_frequency_between_bins() -> None:
    """Four parameters of an exact sine come back to rounding, from a start half a bin off."""
    time_s = np.arange(4000) / RATE_HZ
    fit = fit_sine(0.3 * np.cos(2 * np.pi * 159.3 * time_s + 1) + 0.05, RATE_HZ, 158.3)
    assert fit.frequency_hz == pytest.approx(159.3, rel=1e-9)
    assert (fit.amplitude, fit.offset) == pytest.approx((0.3, 0.05), rel=1e-9)
