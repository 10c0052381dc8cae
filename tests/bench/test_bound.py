"""The Cramér-Rao bound of the accuracy bench against published figures and direct derivatives."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.bench.accuracy.bound import Line, Stretch, mode_bounds
from tests.bench.accuracy.recordings import TrueMode
from tests.bench.accuracy.sums import power_sums
from tests.bench.accuracy.surroundings import Density

RATE_HZ = 1024.0

# frequency, damping ratio, seconds, amplitude over noise in dB, sd of frequency, relative sd of
# damping: one damped sinusoid in white noise by direct inversion of its Fisher matrix; the matrix
# is that of Yao & Pandit 1995, IEEE Trans. Signal Processing 43 (from memory)
ONE_MODE = [
    (20, 0.01, 4, 40, 2.801e-4, 1.407e-3),
    (20, 0.02, 2, 40, 7.905e-4, 1.992e-3),
    (10, 0.005, 8, 40, 3.848e-5, 7.715e-4),
    (35, 0.03, 2, 30, 1.059e-2, 1.017e-2),
    (20, 0.01, 1, 40, 4.645e-4, 2.332e-3),
]


@pytest.mark.parametrize(
    ("frequency", "damping", "seconds", "level_db", "frequency_sd", "relative_sd"), ONE_MODE
)
def test_one_mode_has_the_tabulated_bound(
    frequency: float,
    damping: float,
    seconds: float,
    level_db: float,
    frequency_sd: float,
    relative_sd: float,
) -> None:
    """At a phase of 0.3; undamped and damped frequency differ by the square of damping."""
    density = 10 ** (-level_db / 10) * 2 / RATE_HZ
    tap = Stretch(0, round(seconds * RATE_HZ), np.array([np.exp(0.3j)]))
    (bound,) = mode_bounds([TrueMode(frequency, damping)], [tap], RATE_HZ, np.array([density]))
    assert bound.frequency_sd_hz == pytest.approx(frequency_sd, rel=0.002)
    assert bound.damping_sd / damping == pytest.approx(relative_sd, rel=0.002)


def test_long_records_follow_the_closed_form() -> None:
    """var(omega) = var(alpha) = 16 alpha^3 sigma^2 / (sum of A^2 fs), and 2 / sqrt(energy)."""
    mode, sigma, amplitudes = TrueMode(40.0, 0.004), 0.02, np.array([1.0, 0.3])
    taps = [Stretch(0, round(12 * RATE_HZ), np.array([a * 1j])) for a in amplitudes]
    density = np.array([sigma**2 * 2 / RATE_HZ])
    (bound,) = mode_bounds([mode], taps, RATE_HZ, density)
    alpha = -mode.pole.real
    closed = np.sqrt(16 * alpha**3 * sigma**2 / (np.sum(amplitudes**2) * RATE_HZ)) / (2 * np.pi)
    assert bound.frequency_sd_hz == pytest.approx(closed, rel=0.005)
    assert bound.damping_sd == pytest.approx(closed / mode.frequency_hz, rel=0.005)
    energy = 10 ** (bound.energy_db / 10)
    assert bound.damping_sd / mode.damping_ratio == pytest.approx(2 / np.sqrt(energy), rel=0.005)


@pytest.mark.parametrize("count", [5, 100, 8192])
@pytest.mark.parametrize("step", [0, -1e-6, 1e-5j, -1e-3 + 0.7j, -0.1 + 3j, -0.02 + 6.2j])
def test_sums_of_powers_are_those_of_their_terms(count: int, step: complex) -> None:
    n = np.arange(count)
    direct = [np.sum(n**k * np.exp(step * n)) for k in range(3)]
    size = [np.sum(n**k * np.exp(np.real(step) * n)) for k in range(3)]
    closed = power_sums(np.array([step], complex), count)[:, 0]
    assert np.max(np.abs(closed - direct) / size) < 1e-9


@pytest.mark.parametrize("coherent", [True, False])
def test_pair_beside_a_tone_agrees_with_derivatives_taken_by_differences(coherent: bool) -> None:
    """Two modes a bandwidth apart, two taps and a background, a tone between the modes."""
    modes = [TrueMode(20.0, 0.02), TrueMode(20.8, 0.015)]
    starts, counts = (0, 1500, 3200), (1200, 1500, 1400)
    amplitudes = np.array([[1.0, 0.4j], [0.5j, 0.9]])
    density = 2e-6
    background = Stretch(starts[0], counts[0], np.zeros(0))
    taps = [Stretch(starts[i + 1], counts[i + 1], amplitudes[i]) for i in range(2)]
    bounds = mode_bounds(
        modes,
        taps,
        RATE_HZ,
        np.full(2, density),
        [Line(20.4, coherent)],
        np.array([density]),
        [background],
    )
    direct = by_differences(modes, amplitudes, starts, counts, coherent)
    direct *= np.sqrt(density * RATE_HZ / 2)
    for j, bound in enumerate(bounds):
        assert bound.frequency_sd_hz == pytest.approx(direct[2 * j], rel=1e-4)
        assert bound.damping_sd == pytest.approx(direct[2 * j + 1], rel=1e-4)


@pytest.mark.parametrize(("frequency_hz", "damping"), [(8.0, 0.02), (30.0, 0.01), (90.0, 0.03)])
def test_density_at_the_mode_does_for_coloured_noise(frequency_hz: float, damping: float) -> None:
    """Within six per cent of weighing every transform bin, even where the density is steep."""
    mode, noise = TrueMode(frequency_hz, damping), Density(((1e-6, 1.5), (1e-7, 0.0)))
    count = round(8 * RATE_HZ)
    tap = Stretch(0, count, np.array([1.0 + 0.5j]))
    (bound,) = mode_bounds([mode], [tap], RATE_HZ, noise.at(np.array([frequency_hz])))
    t = np.arange(count) / RATE_HZ
    wave = np.exp(mode.pole * t)
    step = 1e-6
    moved = [
        np.real((1 + 0.5j) * (np.exp(TrueMode(*p).pole * t) - wave)) / step
        for p in ((frequency_hz + step, damping), (frequency_hz, damping + step))
    ]
    spectra = np.fft.rfft(np.array([*moved, wave.real, -wave.imag]), axis=1)[:, 1:]
    density = noise.at(np.fft.rfftfreq(count, 1 / RATE_HZ)[1:])
    weighted = spectra * np.sqrt(4 / (density * RATE_HZ * count))
    sd = np.sqrt(np.diag(np.linalg.inv(np.real(weighted @ weighted.conj().T))))
    assert bound.frequency_sd_hz == pytest.approx(sd[0], rel=0.06)
    assert bound.damping_sd == pytest.approx(sd[1], rel=0.06)


def by_differences(
    modes: list[TrueMode],
    amplitudes: NDArray[np.complex128],
    starts: tuple[int, ...],
    counts: tuple[int, ...],
    coherent: bool,
) -> NDArray[np.float64]:
    """Standard deviations of frequency and damping of each mode in noise of unit variance."""

    def signal(p: NDArray[np.float64]) -> NDArray[np.float64]:
        parts = []
        for i, (start, count) in enumerate(zip(starts, counts, strict=True)):
            t = np.arange(count) / RATE_HZ
            at = 4 + 8 + (0 if coherent else 4 * i)
            since = t + start / RATE_HZ if coherent else t
            a, b, c, d = p[at : at + 4]
            tone = (a + c * since) * np.cos(2 * np.pi * 20.4 * since)
            total = tone - (b + d * since) * np.sin(2 * np.pi * 20.4 * since)
            for j in range(2) if i else ():
                mode = TrueMode(p[2 * j], p[2 * j + 1])
                real, imag = p[4 + 4 * (i - 1) + 2 * j : 6 + 4 * (i - 1) + 2 * j]
                total = total + np.real((real + 1j * imag) * np.exp(mode.pole * t))
            parts.append(total)
        return np.concatenate(parts)

    poles = [v for m in modes for v in (m.frequency_hz, m.damping_ratio)]
    mixed = [v for c in amplitudes.ravel() for v in (c.real, c.imag)]
    start = np.array(poles + mixed + [0.3, 0.2, 0.0, 0.0] * (1 if coherent else 3))
    jacobian = []
    for k in range(len(start)):
        step = np.zeros(len(start))
        step[k] = 1e-6
        jacobian.append((signal(start + step) - signal(start - step)) / 2e-6)
    information = np.array(jacobian) @ np.array(jacobian).T
    return np.sqrt(np.diag(np.linalg.inv(information)))[:4]
