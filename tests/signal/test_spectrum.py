"""Spectra of taps and of running machines, and conversions between quantities."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.integration import differentiate, integrate
from fieldkit.signal.spectrum import (
    SAMPLE_UNITS,
    convert,
    overall_rms,
    power_density,
    running_spectrum,
    tap_spectrum,
)

RATE_HZ = 1000.0


def decay(frequency_hz: float, sigma: float = 3.0, seconds: float = 4.0, phase: float = 0.0):
    t = np.arange(int(seconds * RATE_HZ)) / RATE_HZ
    return np.exp(-sigma * t) * np.sin(2 * np.pi * frequency_hz * t + phase)


def test_tap_spectrum_peaks_at_the_frequency_with_the_height_of_the_decay():
    """Of A exp(-s t) sin(...) the transform is A/(2 s) at its peak, in unit seconds."""
    spectrum = tap_spectrum([2.0 * decay(40.0)], RATE_HZ, quantity="velocity", scale=1e-3)
    k = int(np.argmax(spectrum.amplitude))
    assert spectrum.frequency_hz[k] == pytest.approx(40.0, abs=0.13)
    assert spectrum.amplitude[k] == pytest.approx(2e-3 / 6.0, rel=0.02)
    assert (spectrum.scaling, spectrum.quantity, spectrum.unit) == ("decay", "velocity", "m/s")


def test_unequal_blows_count_the_same_in_the_shape():
    first, second = decay(40.0), decay(70.0)
    even = tap_spectrum([first, second], RATE_HZ).amplitude
    uneven = tap_spectrum([100.0 * first, second], RATE_HZ).amplitude
    np.testing.assert_allclose(uneven, 10.0 * even, rtol=1e-9, atol=1e-12)


def test_phase_of_the_blows_does_not_cancel():
    one = tap_spectrum([decay(40.0)], RATE_HZ).amplitude
    both = tap_spectrum([decay(40.0), -decay(40.0)], RATE_HZ).amplitude
    np.testing.assert_allclose(both, one, rtol=1e-9)


def test_no_window_is_laid_on_a_decay():
    """The half-power width is that of the decay, sigma/pi, not of any window."""
    spectrum = tap_spectrum([decay(40.0, sigma=3.0, seconds=20.0)], RATE_HZ)
    above = spectrum.frequency_hz[spectrum.amplitude > spectrum.amplitude.max() / np.sqrt(2)]
    assert above[-1] - above[0] == pytest.approx(3.0 / np.pi, abs=2 * spectrum.frequency_hz[1])


def test_decays_of_unequal_length_share_one_grid():
    long, short = decay(40.0, seconds=4.0), decay(40.0, seconds=3.0)
    spectrum = tap_spectrum([long, short], RATE_HZ)
    alone = tap_spectrum([long], RATE_HZ)
    above = spectrum.frequency_hz > 5.0
    np.testing.assert_allclose(
        spectrum.amplitude[above], alone.amplitude[above], rtol=0.02, atol=1e-5
    )
    assert spectrum.bandwidth_hz == pytest.approx((1 / 4 + 1 / 3) / 2)


def test_offset_of_a_sensor_leaves_the_tap_spectrum_alone():
    plain = tap_spectrum([decay(40.0)], RATE_HZ).amplitude
    offset = tap_spectrum([decay(40.0) + 9.81], RATE_HZ).amplitude
    np.testing.assert_allclose(offset, plain, rtol=1e-7, atol=1e-12)


def test_nothing_to_average_is_refused():
    for decays in ([], [np.zeros(100)], [decay(40.0), np.zeros(100)]):
        with pytest.raises(Refusal):
            tap_spectrum(decays, RATE_HZ)


@given(
    frequency_hz=st.floats(5.0, 450.0),
    rms=st.floats(1e-6, 1e3),
    phase=st.floats(0, 6.28),
    seconds=st.sampled_from([4.0, 11.3, 30.0]),
)
@settings(max_examples=40, deadline=None)
def test_a_sine_anywhere_reads_its_rms(frequency_hz, rms, phase, seconds):
    t = np.arange(int(seconds * RATE_HZ)) / RATE_HZ
    signal = np.sqrt(2) * rms * np.sin(2 * np.pi * frequency_hz * t + phase)
    spectrum = running_spectrum(signal, RATE_HZ)
    assert spectrum.amplitude.max() == pytest.approx(rms, rel=1e-3)


def test_running_spectrum_matches_scipys_welch():
    """The same window, segments and overlap through scipy: 10 s segments, 76 % overlap."""
    from scipy.signal import welch
    from scipy.signal.windows import general_cosine

    length, step = 10_000, 2400
    noise = np.random.default_rng(2).standard_normal(length + 14 * step)
    window = general_cosine(length, [1, 1.942604, 1.340318, 0.440811, 0.043097], sym=False)
    spectrum = running_spectrum(noise, RATE_HZ)
    theirs_hz, theirs = welch(noise, RATE_HZ, window, noverlap=length - step, scaling="spectrum")
    np.testing.assert_allclose(spectrum.frequency_hz, theirs_hz, atol=1e-9)
    np.testing.assert_allclose(spectrum.amplitude, np.sqrt(theirs), rtol=1e-9, atol=1e-12)


def test_bandwidth_turns_lines_into_noise_density():
    noise = np.random.default_rng(3).standard_normal(120_000)
    spectrum = running_spectrum(noise, RATE_HZ)
    density = spectrum.amplitude[20:-20] ** 2 / spectrum.bandwidth_hz
    assert density.mean() == pytest.approx(2 / RATE_HZ, rel=0.02)


def test_end_of_the_record_is_not_left_out():
    """A burst in the last tenth of a record whose length fits no whole number of steps shows."""
    signal = np.zeros(47_321)
    t = np.arange(4000) / RATE_HZ
    signal[-4000:] = np.sin(2 * np.pi * 100 * t)
    assert running_spectrum(signal, RATE_HZ).amplitude.max() > 0.005


def test_unknown_calibration_stays_in_sample_units():
    signal = np.random.default_rng(1).standard_normal(5000)
    for options in ({}, {"quantity": "velocity"}, {"scale": 3.0}):
        spectrum = running_spectrum(signal, RATE_HZ, **options)
        assert spectrum.unit == SAMPLE_UNITS
        np.testing.assert_array_equal(
            spectrum.amplitude, running_spectrum(signal, RATE_HZ).amplitude
        )
    assert convert(running_spectrum(signal, RATE_HZ, quantity="velocity"), "displacement").unit == (
        SAMPLE_UNITS
    )


def test_too_short_a_record_is_refused():
    for spectrum in (running_spectrum, power_density):
        with pytest.raises(Refusal, match="too short"):
            spectrum(np.ones(20), RATE_HZ)


def test_conversion_leaves_nothing_below_the_corner():
    signal = np.random.default_rng(1).standard_normal(30_000)
    acceleration = running_spectrum(signal, RATE_HZ, quantity="acceleration", scale=1.0)
    velocity = convert(acceleration, "velocity", corner_hz=5.0)
    f = velocity.frequency_hz
    assert np.all(velocity.amplitude[f < 5.0] == 0.0)
    kept = f >= 5.0
    expected = acceleration.amplitude[kept] / (2 * np.pi * f[kept])
    np.testing.assert_allclose(velocity.amplitude[kept], expected)
    back = convert(velocity, "acceleration")
    np.testing.assert_allclose(back.amplitude[kept], acceleration.amplitude[kept])
    assert convert(acceleration, "acceleration") is acceleration


@pytest.mark.parametrize(("quantity", "wanted"), [("pressure", "velocity"), (None, "velocity")])
def test_what_is_no_motion_cannot_be_converted(quantity, wanted):
    signal = np.random.default_rng(1).standard_normal(5000)
    spectrum = running_spectrum(signal, RATE_HZ, quantity=quantity, scale=1.0)
    with pytest.raises(InputError, match="cannot be turned into velocity"):
        convert(spectrum, wanted)


@given(n=st.integers(100, 700), times=st.integers(1, 2), seed=st.integers(0, 1000))
@settings(max_examples=60, deadline=None)
def test_integrating_undoes_differentiating(n, times, seed):
    """For signals whose content lies between the corner and half the rate."""
    rng = np.random.default_rng(seed)
    lines = np.fft.rfft(rng.standard_normal(n))
    f = np.fft.rfftfreq(n, 1 / RATE_HZ)
    lines[(f < 20.0) | (np.arange(len(f)) == n / 2)] = 0.0
    signal = np.fft.irfft(lines, n)
    there = differentiate(signal, RATE_HZ, times)
    back = integrate(there, RATE_HZ, times, corner_hz=20.0)
    np.testing.assert_allclose(back, signal, atol=1e-9)
    forth = differentiate(integrate(signal, RATE_HZ, times, corner_hz=20.0), RATE_HZ, times)
    np.testing.assert_allclose(forth, signal, atol=1e-9)


@given(low=st.floats(0.5, 200), width=st.floats(1, 200), seed=st.integers(0, 1000))
@settings(max_examples=40, deadline=None)
def test_bands_side_by_side_add_up_in_energy(low, width, seed):
    signal = np.random.default_rng(seed).standard_normal(2000)
    edges = [0.0, np.nextafter(low, 0), low, low + width, np.nextafter(low + width, 1e3), 500.0]
    bands = zip(edges[0::2], edges[1::2], strict=True)
    parts = [overall_rms(signal, RATE_HZ, *band) for band in bands]
    assert np.sum(np.square(parts)) == pytest.approx(np.mean(signal**2), rel=1e-9)


def test_long_records_are_added_up_block_by_block(monkeypatch):
    from fieldkit.signal import spectrum

    signal = np.random.default_rng(1).standard_normal(50_000)
    signal += np.sin(2 * np.pi * 50 * np.arange(50_000) / RATE_HZ)
    whole = overall_rms(signal, RATE_HZ, 0.0, 500.0), overall_rms(signal, RATE_HZ, 10.0, 100.0)
    monkeypatch.setattr(spectrum, "_BLOCK_SAMPLES", 8000)
    blocks = overall_rms(signal, RATE_HZ, 0.0, 500.0), overall_rms(signal, RATE_HZ, 10.0, 100.0)
    assert blocks[0] == pytest.approx(whole[0], rel=1e-12)
    assert blocks[1] == pytest.approx(whole[1], rel=5e-3)


@pytest.mark.parametrize(("low", "high"), [(10.0, 10.0), (50.0, 10.0), (-1.0, 5.0)])
def test_impossible_band_is_refused(low, high):
    with pytest.raises(InputError, match="lower frequency first"):
        overall_rms(np.ones(100), RATE_HZ, low, high)
