"""The exact transform of a decay, and a lower rate that does not move its pole."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.signal.background import NoiseDensity, noise_density
from fieldkit.signal.bands import band, subtract
from fieldkit.signal.decays import damped, damping_without_window, geometric
from fieldkit.signal.decimation import decimate
from fieldkit.signal.tones import centred
from fieldkit.signal.traces import Component, Trace, fast_length, sampled
from tests.signal.made_taps import coloured, hum


@settings(max_examples=60, deadline=None)
@given(
    decay=st.floats(0.0, 2.0),
    turn=st.floats(0.0, 3.1),
    count=st.integers(2, 400),
)
def test_geometric_sums_are_the_transform(decay: float, turn: float, count: int) -> None:
    """Closed form against the sum itself, for any pole, on every bin, with and without times n."""
    exponent = complex(-decay, turn)
    samples = np.exp(exponent * np.arange(count))
    bins = np.exp(-2j * np.pi * np.arange(count) / count)
    plain, ramp = geometric(
        np.exp(exponent) * bins, np.full(count, np.exp(exponent * count)), np.array(float(count))
    )
    assert plain == pytest.approx(np.fft.fft(samples), abs=1e-8 * count)
    assert ramp == pytest.approx(np.fft.fft(np.arange(count) * samples), abs=1e-7 * count**2)


def test_steady_tone_on_a_bin_has_a_transform() -> None:
    """No decay and exactly on a bin: the sum is the number of samples, not 0 / 0."""
    plain, ramp = geometric(np.array([1 + 0j]), np.array([1 + 0j]), np.array(64.0))
    assert plain == pytest.approx([64.0])
    assert ramp == pytest.approx([64.0 * 63 / 2])


@settings(max_examples=30, deadline=None)
@given(decay=st.floats(0.0, 0.1), turn=st.floats(0.0, 3.0), count=st.integers(1, 1000))
def test_damped_is_the_exponential(decay: float, turn: float, count: int) -> None:
    exponent = complex(-decay, turn)
    assert damped(exponent, count) == pytest.approx(np.exp(exponent * np.arange(count)), abs=1e-11)


def test_lower_rate_keeps_the_pole_exactly() -> None:
    """What comes out is the same exponential: each sample over the one before is exp(p / rate)."""
    pole = complex(-12.0, 2 * np.pi * 90.0)
    samples = np.exp(pole * np.arange(24000) / 48000.0)
    lower, rate_hz = decimate(samples.real, 48000.0, keep_hz=600.0, wanted_rate_hz=4800.0)
    quadrature, _ = decimate(samples.imag, 48000.0, keep_hz=600.0, wanted_rate_hz=4800.0)
    assert rate_hz == 4800.0
    whole = lower + 1j * quadrature
    assert whole[1:] / whole[:-1] == pytest.approx(np.exp(pole / rate_hz), rel=1e-9)
    assert abs(whole[0]) == pytest.approx(1.0, abs=0.02)


def test_lower_rate_keeps_out_what_would_alias() -> None:
    time_s = np.arange(48000) / 48000.0
    above = np.cos(2 * np.pi * (4800.0 - 500.0) * time_s)
    lower, _ = decimate(above, 48000.0, keep_hz=600.0, wanted_rate_hz=4800.0)
    assert np.abs(lower).max() < 2e-4


@pytest.mark.parametrize("exponent", [0.0, 1.0, 2.0])
def test_noise_density_is_read_past_steady_lines(exponent: float) -> None:
    """The density made is the density read, within 1.5 dB, whatever hums in it."""
    noise = coloured(np.random.default_rng(5), 40000, 2000.0, 1e-3, exponent)
    found = noise_density([noise + hum(40000, 2000.0, 50.0, [0.3, 0.1])], 2000.0)
    assert found is not None
    frequency_hz = np.array([10.0, 20.0, 50.0, 100.0, 300.0, 800.0])
    expected = 1e-6 * (frequency_hz / 20.0) ** -exponent
    assert np.abs(10 * np.log10(found.at(frequency_hz) / expected)).max() < 1.5


@pytest.mark.parametrize("bend", [-3.0, 0.4, 6.0])
def test_drifting_decay_has_the_transform_of_its_samples(bend: float) -> None:
    """Taken out in the band, nothing is left of its own samples."""
    poles = np.full(2, complex(-1.3, 2 * np.pi * 21.0))
    part = Component(poles, np.array([1.0 + 0.2j, -0.5j]), np.zeros(2, complex), bend=bend)
    noise = NoiseDensity(np.array([1.0, 200.0]), np.ones(2))
    traces = [Trace(sampled(part, k, 4000, 400.0), 400.0, noise) for k in range(2)]
    whole = band(traces, 5.0, 40.0, 10.0)
    left = subtract(whole, [part])
    assert np.abs(left.data).max() < 1e-8 * np.abs(whole.data).max()


def test_tone_takes_the_frequency_it_has_in_each_tap() -> None:
    """A fitted line that was 0.02 Hz off follows to where it is, its samples unchanged at first."""
    poles = np.full(1, 2j * np.pi * 30.0)
    off = Component(poles, np.array([1.0 + 0j]), np.array([2j * np.pi * 0.02]), steady=True)
    moved = centred(off, np.array([5.0]))
    assert moved.frequency_hz == pytest.approx(30.02, abs=0.002)
    middle = slice(900, 1100)
    assert sampled(moved, 0, 2000, 400.0)[middle] == pytest.approx(
        sampled(off, 0, 2000, 400.0)[middle], abs=0.01
    )


@settings(max_examples=40, deadline=None)
@given(wanted=st.floats(16.0, 1e6))
def test_lengths_are_few_and_hardly_longer_than_asked(wanted: float) -> None:
    """Four an octave, with a fast transform: every prime factor is 5 at most."""
    length = fast_length(wanted)
    assert wanted - 1e-6 < length < 1.3 * wanted + 2
    for prime in (2, 3, 5):
        while length % prime == 0:
            length //= prime
    assert length == 1


def test_too_short_a_background_has_no_density() -> None:
    assert noise_density([np.zeros(10)], 1000.0) is None
    assert noise_density([], 1000.0) is None


def test_window_correction_undoes_the_window() -> None:
    assert damping_without_window(0.01 + 1 / (2.0 * 2 * np.pi * 25.0), 2.0, 25.0) == pytest.approx(
        0.01
    )
