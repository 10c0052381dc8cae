"""Windows, levels and conversions against published values and closed forms."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.column_labels import STANDARD_GRAVITY_M_PER_S2, unit_in
from fieldkit.signal.integration import differentiate, integrate
from fieldkit.signal.spectrum import (
    convert,
    overall_rms,
    power_density,
    running_spectrum,
    tap_spectrum,
)
from fieldkit.signal.windows import FLAT_TOP, HANN, HFT90D, RECTANGULAR, Window

# Coherent gain, equivalent noise bandwidth in bins, scallop loss in dB, 3 dB width in bins.
# Harris 1978, Proc. IEEE 66, 51, lists ENBW 1.00 and 1.50 and scallop 3.92 and 1.42 dB for the
# first two (from memory). The report of HFT90D (Heinzel, Ruediger and Schilling 2002) gives it
# 3.8832 bins and 0.0039 dB (from memory); its coefficients are quoted from there. The other
# figures are computed from the windows' definitions, independently of this package.
WINDOW_TABLE = [
    (RECTANGULAR, 1.0, 1.0000, -3.9224, 0.886),
    (HANN, 0.5, 1.5000, -1.4236, 1.441),
    (FLAT_TOP, 0.21558, 3.7702, -0.0098, 3.725),
    (HFT90D, 1.0, 3.8832, -0.0039, 3.836),
]
# Highest side lobe in dB, same sources.
SIDE_LOBES = [(RECTANGULAR, -13.3), (HANN, -31.5), (FLAT_TOP, -93.0), (HFT90D, -90.2)]

N = 4096


def transform_at(window: Window, offset_bins: float) -> float:
    """Magnitude of the window's transform off the line, over its value on the line."""
    samples = window.samples(N)
    turned = np.exp(-2j * np.pi * offset_bins * np.arange(N) / N)
    return float(abs(samples @ turned) / samples.sum())


@pytest.mark.parametrize(("window", "gain", "enbw", "scallop_db", "width"), WINDOW_TABLE)
def test_window_has_its_tabulated_figures(window, gain, enbw, scallop_db, width):
    samples = window.samples(N)
    assert samples.mean() == pytest.approx(gain, abs=5e-6)
    assert N * (samples @ samples) / samples.sum() ** 2 == pytest.approx(enbw, abs=1e-4)
    assert window.noise_bandwidth_bins == pytest.approx(enbw, abs=1e-4)
    assert 20 * np.log10(transform_at(window, 0.5)) == pytest.approx(scallop_db, abs=1e-4)
    assert transform_at(window, width / 2) == pytest.approx(np.sqrt(0.5), abs=1e-3)


@pytest.mark.parametrize(("window", "highest_db"), SIDE_LOBES)
def test_side_lobes_are_as_low_as_tabulated(window, highest_db):
    samples = window.samples(N)
    padded = np.abs(np.fft.rfft(samples, 32 * N)) / samples.sum()
    beyond = padded[32 * window.half_width_bins :]
    assert 20 * np.log10(beyond.max()) == pytest.approx(highest_db, abs=0.1)


@pytest.mark.parametrize(("window", "name"), [(HANN, "hann"), (FLAT_TOP, "flattop")])
@pytest.mark.parametrize("n", [64, 1001])
def test_window_samples_match_scipy(window, name, n):
    from scipy.signal import get_window

    np.testing.assert_allclose(window.samples(n), get_window(name, n), atol=1e-12)


def test_hft90d_matches_scipys_general_cosine():
    from scipy.signal.windows import general_cosine

    coefficients = [1, 1.942604, 1.340318, 0.440811, 0.043097]
    expected = general_cosine(500, coefficients, sym=False)
    np.testing.assert_allclose(HFT90D.samples(500), expected, atol=1e-12)


def test_window_response_is_its_transform():
    for window, *_ in WINDOW_TABLE:
        for offset in (0.0, 0.31, 0.5, 1.7, 3.2):
            expected = transform_at(window, offset)
            assert window.response(offset) == pytest.approx(expected, abs=2e-6)


def steady(quantity: str, rms: float, frequency_hz: float, rate_hz: float = 2000.0, s: float = 30):
    """A running spectrum of one sine of known level."""
    t = np.arange(int(s * rate_hz)) / rate_hz
    signal = np.sqrt(2) * rms * np.sin(2 * np.pi * frequency_hz * t + 0.4)
    return running_spectrum(signal, rate_hz, quantity=quantity, scale=1.0)


@pytest.mark.parametrize("frequency_hz", [25.0, 25.013, 25.037, 25.05, 24.913, 312.4567])
def test_steady_sine_reads_its_rms_between_lines_too(frequency_hz):
    """Amplitude-true within 0.1 %: HFT90D differs by 0.0039 dB = 0.045 % at most."""
    assert steady("velocity", 3.0, frequency_hz).amplitude.max() == pytest.approx(3.0, rel=5e-4)


def test_calibrator_frequency_turns_one_g_into_9_807_in_every_unit():
    """At 1000 rad/s, 1 g rms = 9.807 m/s^2 = 9.807 mm/s = 9.807 um (closed form; convention of
    field calibrators, from memory)."""
    acceleration = steady("acceleration", STANDARD_GRAVITY_M_PER_S2, 1000 / (2 * np.pi))
    velocity = convert(acceleration, "velocity")
    displacement = convert(velocity, "displacement")
    k = int(np.argmax(acceleration.amplitude))
    factor = 1000 / (2 * np.pi * acceleration.frequency_hz[k])
    assert velocity.amplitude[k] == pytest.approx(9.80665e-3 * factor, rel=5e-4)
    assert displacement.amplitude[k] == pytest.approx(9.80665e-6 * factor**2, rel=5e-4)
    assert (velocity.unit, displacement.unit) == ("m/s", "m")


def test_calibrator_frequency_in_the_time_domain():
    """9.807 mm/s rms is 13.87 mm/s peak (closed form)."""
    rate_hz = 16000 / (2 * np.pi)
    t = np.arange(16 * 500) / rate_hz
    acceleration = np.sqrt(2) * STANDARD_GRAVITY_M_PER_S2 * np.cos(1000 * t)
    velocity = integrate(acceleration, rate_hz)
    displacement = integrate(acceleration, rate_hz, times=2)
    assert np.sqrt(np.mean(velocity**2)) == pytest.approx(9.80665e-3, rel=1e-9)
    assert velocity.max() == pytest.approx(13.87e-3, abs=5e-6)
    assert np.sqrt(np.mean(displacement**2)) == pytest.approx(9.80665e-6, rel=1e-9)
    np.testing.assert_allclose(velocity, np.sqrt(2) * 9.80665e-3 * np.sin(1000 * t), atol=1e-12)
    np.testing.assert_allclose(differentiate(velocity, rate_hz), acceleration, atol=1e-8)


def test_one_g_peak_at_ten_hertz_in_velocity_and_displacement():
    """156.08 mm/s and 2.484 mm peak (closed form)."""
    spectrum = steady("acceleration", STANDARD_GRAVITY_M_PER_S2 / np.sqrt(2), 10.0, rate_hz=1000)
    k = int(np.argmin(abs(spectrum.frequency_hz - 10.0)))
    assert spectrum.frequency_hz[k] == pytest.approx(10.0, abs=1e-9)
    velocity_peak = np.sqrt(2) * convert(spectrum, "velocity").amplitude[k]
    displacement_peak = np.sqrt(2) * convert(spectrum, "displacement").amplitude[k]
    assert velocity_peak == pytest.approx(156.08e-3, rel=1e-4)
    assert displacement_peak == pytest.approx(2.484e-3, rel=2e-4)


@pytest.mark.parametrize(
    ("unit", "quantity", "si"),
    [
        ("g", "acceleration", 9.80665),  # standard gravity, exact (CGPM 1901)
        ("in/s", "velocity", 0.0254),  # exact
        ("mil", "displacement", 25.4e-6),  # exact
        ("psi", "pressure", 6894.757293168),  # NIST SP 811, appendix B
        ("bar", "pressure", 1e5),  # exact
    ],
)
def test_units_have_their_defined_size(unit, quantity, si):
    assert unit_in(unit) == (quantity, pytest.approx(si, rel=1e-12))


def test_white_noise_has_twice_its_variance_over_the_rate_as_density():
    """One-sided density 2 sigma^2 / fs (closed form); here 3^2 2 / 1000 = 0.018, and its integral
    is the variance."""
    noise = 3.0 * np.random.default_rng(4).standard_normal(400_000)
    frequency_hz, density = power_density(noise, 1000.0)
    inner = density[10:-10]
    averages = 400_000 / 10_000
    allowed = 4 / np.sqrt(averages * len(inner) / 1.5)
    assert inner.mean() == pytest.approx(0.018, rel=allowed)
    assert density.sum() * frequency_hz[1] == pytest.approx(noise.var(), rel=5e-3)


def test_power_density_matches_scipys_welch():
    """Same segments by construction: 7 half-overlapping ones that fit the record exactly."""
    from scipy.signal import welch

    rate_hz, length = 1000.0, 2500
    noise = np.random.default_rng(5).standard_normal(4 * length)
    frequency_hz, density = power_density(noise, rate_hz, low_hz=2.0)
    theirs_hz, theirs = welch(noise, rate_hz, "hann", length, length // 2)
    np.testing.assert_allclose(frequency_hz, theirs_hz, atol=1e-9)
    np.testing.assert_allclose(density, theirs, rtol=1e-9, atol=1e-12)


def test_overall_rms_of_the_whole_band_is_the_rms_of_the_samples():
    """Parseval's theorem, for even and odd lengths."""
    for n in (1000, 1001):
        signal = 0.3 + np.random.default_rng(n).standard_normal(n)
        expected = np.sqrt(np.mean(signal**2))
        assert overall_rms(signal, 500.0, 0.0, 250.0) == pytest.approx(expected, rel=1e-12)


def test_overall_rms_adds_the_squares_of_the_sines_in_the_band():
    rate_hz = 1000.0
    t = np.arange(10_000) / rate_hz
    parts = [(1.0, 1.5), (2.0, 10.0), (0.7, 60.0), (5.0, 300.0)]
    signal = sum(a * np.sin(2 * np.pi * f * t) for a, f in parts)
    expected = np.sqrt((2.0**2 + 0.7**2) / 2)
    assert overall_rms(signal, rate_hz, 2.0, 200.0) == pytest.approx(expected, rel=1e-9)


def test_tap_spectrum_of_one_decay_is_its_fourier_integral():
    """|X(f)| of exp(-a t) sin(b t) is b / |(a + i 2 pi f)^2 + b^2| (table of Fourier integrals)."""
    rate_hz, a, b = 8000.0, 6.0, 2 * np.pi * 40.0
    t = np.arange(int(4 * rate_hz)) / rate_hz
    spectrum = tap_spectrum([np.exp(-a * t) * np.sin(b * t)], rate_hz)
    band = (spectrum.frequency_hz > 10) & (spectrum.frequency_hz < 150)
    s = a + 2j * np.pi * spectrum.frequency_hz[band]
    np.testing.assert_allclose(spectrum.amplitude[band], b / abs(s**2 + b**2), rtol=2e-3)
