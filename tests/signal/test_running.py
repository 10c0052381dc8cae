"""What is read from the recording of a running machine."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.running import read_running
from fieldkit.signal.steady_lines import LEAST_PROMINENCE, MOST_LINES

RATE_HZ = 1024.0


def times(seconds: float) -> np.ndarray:
    return np.arange(int(seconds * RATE_HZ)) / RATE_HZ


def sines(seconds: float, *lines: tuple[float, float], noise: float = 0.0, seed: int = 0):
    """Sines of (frequency_hz, rms), with white noise of the given RMS."""
    t = times(seconds)
    rng = np.random.default_rng(seed)
    signal = noise * rng.standard_normal(len(t))
    for frequency_hz, rms in lines:
        phase = rng.uniform(0, 2 * np.pi)
        signal += np.sqrt(2) * rms * np.sin(2 * np.pi * frequency_hz * t + phase)
    return signal


def resonance(seconds: float, frequency_hz: float, damping: float, seed: int) -> np.ndarray:
    """Response of one mode to white noise, of RMS 1: impulse response convolved with noise."""
    t = times(8.0)
    omega = 2 * np.pi * frequency_hz
    response = np.exp(-damping * omega * t) * np.sin(omega * t)
    drive = np.random.default_rng(seed).standard_normal(int((seconds + 8.0) * RATE_HZ))
    n = len(drive) + len(t)
    whole = np.fft.irfft(np.fft.rfft(drive, n) * np.fft.rfft(response, n), n)
    settled = whole[len(t) : len(t) + int(seconds * RATE_HZ)]
    return settled / settled.std()


def test_lines_are_read_with_frequency_level_and_order():
    lines = [(24.73, 3.0), (49.46, 0.8), (173.11, 0.05)]
    picture = read_running(sines(40.0, *lines, noise=0.2), RATE_HZ)
    assert len(picture.lines) == 3
    for found, (frequency_hz, rms) in zip(picture.lines, lines, strict=True):
        assert found.frequency_hz == pytest.approx(frequency_hz, abs=0.01)
        assert found.rms == pytest.approx(rms, rel=0.05)
        assert found.prominence >= LEAST_PROMINENCE
    assert picture.lines[0].rms == pytest.approx(3.0, rel=2e-3)


@pytest.mark.parametrize("frequency_hz", [25.0, 25.02, 25.05, 25.077])
@pytest.mark.parametrize("seconds", [3.0, 12.0, 45.0])
def test_one_sine_gives_one_line(frequency_hz, seconds):
    """Its width and its side lobes are not counted, at any place between lines."""
    picture = read_running(sines(seconds, (frequency_hz, 1.0)), RATE_HZ)
    assert len(picture.lines) == 1
    assert picture.lines[0].frequency_hz == pytest.approx(frequency_hz, abs=2e-3)
    assert picture.lines[0].rms == pytest.approx(1.0, rel=1e-3)
    assert np.isfinite(picture.lines[0].prominence)


def test_slip_is_told_from_mains_in_forty_seconds():
    """49.6 and 50 Hz lie four lines apart: two lines, each with its own level."""
    picture = read_running(sines(40.0, (49.6, 1.0), (50.0, 0.5), noise=0.05), RATE_HZ)
    assert [round(line.frequency_hz, 1) for line in picture.lines] == [49.6, 50.0]
    assert [line.rms for line in picture.lines] == pytest.approx([1.0, 0.5], rel=0.03)


def test_no_more_than_the_strongest_lines_are_listed():
    harmonics = [(12.0 * k, 1.0 / k) for k in range(1, 31)]
    picture = read_running(sines(30.0, *harmonics, noise=1e-3), RATE_HZ)
    assert len(picture.lines) == MOST_LINES
    expected = [frequency_hz for frequency_hz, _ in harmonics[:MOST_LINES]]
    assert [line.frequency_hz for line in picture.lines] == pytest.approx(expected, abs=0.01)


def test_white_noise_has_hardly_any_lines():
    """One false line in a thousand spectra is intended; 40 spectra may show one."""
    found = [read_running(sines(20.0, noise=1.0, seed=seed), RATE_HZ).lines for seed in range(40)]
    assert sum(map(len, found)) <= 1


def test_every_line_well_above_the_noise_is_found():
    """Twenty seeds, a line four times the local median: found each time at its frequency."""
    for seed in range(20):
        picture = read_running(sines(30.0, (37.3, 0.2), noise=1.0, seed=seed), RATE_HZ)
        assert picture.lines[0].frequency_hz == pytest.approx(37.3, abs=0.05)


def test_resonance_stirred_by_noise_is_one_line_and_not_steady():
    pictures = [read_running(resonance(60.0, 31.3, 0.01, seed), RATE_HZ) for seed in range(12)]
    strongest = [picture.lines[0] for picture in pictures]
    assert sum(line.steady is False for line in strongest) >= 11
    assert sum(len(picture.lines) for picture in pictures) <= 14


def test_sine_in_noise_is_steady():
    pictures = [
        read_running(sines(60.0, (31.3, 1.0), noise=1.0, seed=s), RATE_HZ) for s in range(12)
    ]
    assert all(picture.lines[0].steady is True for picture in pictures)


def test_steadiness_is_left_open_where_it_cannot_be_told():
    assert read_running(sines(8.0, (31.3, 1.0), noise=0.1), RATE_HZ).lines[0].steady is None


def test_calibration_scales_lines_spectrum_and_overall():
    signal = sines(20.0, (30.0, 2.0), noise=0.1)
    plain = read_running(signal, RATE_HZ)
    scaled = read_running(signal, RATE_HZ, quantity="acceleration", scale=9.80665)
    assert scaled.lines[0].rms == pytest.approx(9.80665 * plain.lines[0].rms)
    assert scaled.lines[0].prominence == pytest.approx(plain.lines[0].prominence)
    assert scaled.overall_rms == pytest.approx(9.80665 * plain.overall_rms)
    np.testing.assert_allclose(scaled.spectrum.amplitude, 9.80665 * plain.spectrum.amplitude)
    assert (scaled.spectrum.unit, plain.spectrum.unit) == ("m/s^2", "sample units")


def test_overall_counts_the_band_only():
    signal = sines(20.0, (1.0, 5.0), (30.0, 3.0), (60.0, 4.0), (300.0, 7.0))
    picture = read_running(signal, RATE_HZ, low_hz=10.0, high_hz=200.0)
    assert picture.overall_rms == pytest.approx(5.0, rel=1e-3)
    assert [round(line.frequency_hz) for line in picture.lines] == [60, 30]
    assert (picture.low_hz, picture.high_hz) == (10.0, 200.0)


def test_upper_limit_left_out_is_the_rate_over_2_56():
    assert read_running(sines(5.0, (30.0, 1.0)), RATE_HZ).high_hz == pytest.approx(400.0)


def test_band_beyond_half_the_rate_is_cut_with_a_warning():
    picture = read_running(sines(5.0, (30.0, 1.0)), RATE_HZ, high_hz=1000.0)
    assert picture.high_hz == 512.0
    assert "holds nothing above 512 Hz" in picture.warnings[0]


@pytest.mark.parametrize(("low_hz", "high_hz"), [(0.0, 100.0), (100.0, 50.0), (600.0, 900.0)])
def test_impossible_band_is_refused(low_hz, high_hz):
    with pytest.raises(InputError, match="a band from"):
        read_running(sines(5.0, (30.0, 1.0)), RATE_HZ, low_hz=low_hz, high_hz=high_hz)


def test_good_recording_has_no_warnings():
    for seed in range(5):
        signal = sines(30.0, (24.7, 1.0), (49.4, 0.3), noise=0.3, seed=seed)
        assert read_running(signal, RATE_HZ, full_scale=10.0).warnings == ()
        coarse = np.round(signal / 0.05) * 0.05
        assert read_running(coarse, RATE_HZ).warnings == ()


@pytest.mark.parametrize("step", [1e-9, 2**-15, 2**-7])
def test_clipping_is_seen_at_full_scale_and_at_a_rail_of_its_own(step):
    limit = 1.0 - step
    signal = np.clip(np.round(sines(10.0, (24.7, 1.2), noise=0.05) / step) * step, -1.0, limit)
    for found in (read_running(signal, RATE_HZ, full_scale=1.0), read_running(signal, RATE_HZ)):
        assert "clipped" in found.warnings[0]
    lower = read_running(0.3 * signal, RATE_HZ, full_scale=1.0)
    assert "clipped" in lower.warnings[0]
    noisy = signal + 1e-4 * np.random.default_rng(1).standard_normal(len(signal))
    assert "clipped" in read_running(noisy, RATE_HZ).warnings[0]


def test_slow_sine_in_coarse_samples_is_not_taken_for_clipping():
    signal = np.round(20 * np.sin(2 * np.pi * 3.0 * times(10.0))) / 20
    assert read_running(signal, RATE_HZ).warnings == ()


def test_offset_and_drift_are_removed_and_said():
    signal = sines(20.0, (30.0, 1.0))
    picture = read_running(signal + 9.81, RATE_HZ)
    assert "a constant offset of 9.8 times the vibration was removed" in picture.warnings[0]
    assert picture.overall_rms == pytest.approx(1.0, rel=1e-3)
    drifting = read_running(signal + np.linspace(-5.0, 5.0, len(signal)), RATE_HZ)
    assert "a drift over 10 times the vibration was removed" in drifting.warnings[0]
    assert drifting.overall_rms == pytest.approx(1.0, rel=1e-3)
    assert len(drifting.lines) == 1


def test_level_that_changes_is_said():
    signal = sines(20.0, (30.0, 1.0)) * np.linspace(0.3, 1.0, int(20 * RATE_HZ))
    assert "the level changes during the recording" in read_running(signal, RATE_HZ).warnings[0]


def test_short_recording_says_what_it_cannot_tell():
    picture = read_running(sines(1.0, (100.0, 1.0)), RATE_HZ)
    (warning,) = picture.warnings
    assert "lasts only 1 s" in warning
    assert "closer than 2 Hz" in warning
    assert picture.lines[0].frequency_hz == pytest.approx(100.0, abs=0.05)


def test_silence_and_a_handful_of_samples_are_refused():
    with pytest.raises(Refusal, match="silent"):
        read_running(np.full(5000, 0.2), RATE_HZ)
    with pytest.raises(Refusal, match="silent"):
        read_running(np.empty(0), RATE_HZ)
    with pytest.raises(Refusal, match="too short"):
        read_running(np.arange(30.0) % 7, RATE_HZ)


@pytest.mark.parametrize("bad", [np.nan, np.inf])
def test_samples_that_are_not_finite_are_refused(bad):
    signal = sines(5.0, (30.0, 1.0))
    signal[100] = bad
    with pytest.raises(InputError, match="not finite"):
        read_running(signal, RATE_HZ)


@pytest.mark.parametrize(
    ("quantity", "rms"),
    [("acceleration", 9.80665), ("velocity", 9.80665e-3), ("displacement", 9.80665e-6)],
)
def test_the_level_is_told_as_velocity_too(quantity, rms):
    """1 g rms at 1000 rad/s is 9.807 mm/s is 9.807 um (arithmetic of the 159.155 Hz convention)."""
    rate_hz = 2048.0
    wave = np.sqrt(2) * rms / 0.5 * np.sin(1000 * np.arange(int(20 * rate_hz)) / rate_hz)
    picture = read_running(wave, rate_hz, quantity=quantity, scale=0.5)
    assert picture.velocity_rms_m_per_s == pytest.approx(9.80665e-3, rel=1e-3)


def test_no_velocity_is_made_up_for_a_microphone_or_without_calibration():
    wave = np.sin(1000 * np.arange(20_480) / 2048.0)
    assert read_running(wave, 2048.0, quantity="pressure", scale=1.0).velocity_rms_m_per_s is None
    assert read_running(wave, 2048.0, quantity="acceleration").velocity_rms_m_per_s is None
