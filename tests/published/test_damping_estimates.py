"""Frequency and damping from decays: closed forms, and the Cramer-Rao bound of the same record.

Bound of one damped sinusoid A exp(-at) cos(wt + phi) in white noise: the inverse of the 4 x 4
Fisher matrix J J^T / sigma^2 (Yao and Pandit, IEEE Trans. Signal Processing, 1994 and 1995; the
second from memory), evaluated here from its definition.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest

from fieldkit.signal.decays import damping_without_window
from fieldkit.signal.modes import MeasuredMode, TapRecord, estimate_modes

RATE_HZ = 1024.0


@dataclass(frozen=True)
class Case:
    """One decay: damped frequency, decay over angular frequency, length, level over the noise."""

    frequency_hz: float
    damping: float
    duration_s: float
    level_db: float
    bound_hz: float
    """Computed from the Fisher matrix by someone else; to four digits."""
    bound_damping: float

    @property
    def amplitude(self) -> float:
        return float(10 ** (self.level_db / 20))

    @property
    def pole(self) -> complex:
        omega = 2 * np.pi * self.frequency_hz
        return complex(-self.damping * omega, omega)

    @property
    def natural_hz(self) -> float:
        return abs(self.pole) / (2 * np.pi)

    @property
    def damping_ratio(self) -> float:
        return -self.pole.real / abs(self.pole)


CASES = [
    Case(20.0, 0.01, 4.0, 40.0, 2.801e-4, 1.407e-3),
    Case(20.0, 0.02, 2.0, 40.0, 7.905e-4, 1.992e-3),
    Case(10.0, 0.005, 8.0, 40.0, 3.848e-5, 7.715e-4),
    Case(35.0, 0.03, 2.0, 30.0, 1.059e-2, 1.017e-2),
    Case(20.0, 0.01, 1.0, 40.0, 4.645e-4, 2.332e-3),
]
SEEDS = 100


def clean(case: Case, phase: float = 0.4) -> np.ndarray:
    time_s = np.arange(round(case.duration_s * RATE_HZ)) / RATE_HZ
    return case.amplitude * (np.exp(case.pole * time_s + 1j * phase)).real


def bound(case: Case, phase: float = 0.4) -> tuple[float, float]:
    """Standard deviations of frequency and of relative damping that no unbiased estimate beats."""
    time_s = np.arange(round(case.duration_s * RATE_HZ)) / RATE_HZ
    wave = np.exp(case.pole * time_s + 1j * phase)
    jacobian = np.array(
        [
            wave.real,
            -case.amplitude * time_s * wave.real,
            -case.amplitude * time_s * wave.imag,
            -case.amplitude * wave.imag,
        ]
    )
    covariance = np.linalg.inv(jacobian @ jacobian.T)
    decay = -case.pole.real
    return float(np.sqrt(covariance[2, 2]) / (2 * np.pi)), float(np.sqrt(covariance[1, 1]) / decay)


def one_mode(samples: np.ndarray, background: np.ndarray) -> MeasuredMode:
    estimate = estimate_modes([TapRecord(samples, RATE_HZ, background)])
    assert len(estimate.modes) == 1
    return estimate.modes[0]


@pytest.mark.parametrize("case", CASES)
def test_bound_is_the_published_one(case: Case) -> None:
    """The bound evaluated here agrees with the table of bounds, long record and short."""
    assert bound(case) == pytest.approx((case.bound_hz, case.bound_damping), rel=0.02)


@pytest.mark.parametrize("case", CASES)
def test_estimates_reach_the_bound_and_know_it(case: Case) -> None:
    """Unbiased, scatter between 1 and 2 x the bound, 95 % intervals hold at least 88 %.

    With 100 seeds a scatter at the bound reads below 0.75 of it once in some thousand times.
    """
    modes = []
    for seed in range(SEEDS):
        rng = np.random.default_rng(seed)
        noise = rng.standard_normal(round(case.duration_s * RATE_HZ))
        modes.append(one_mode(clean(case) + noise, rng.standard_normal(2048)))
    frequency = np.array([m.frequency_hz for m in modes]) - case.natural_hz
    damping = np.array([m.damping_ratio for m in modes]) / case.damping_ratio - 1
    bound_hz, bound_damping = bound(case)
    for error, least in ((frequency, bound_hz), (damping, bound_damping)):
        assert abs(error.mean()) < 4 * least / np.sqrt(SEEDS)
        assert 0.75 * least < error.std() < 2 * least
    stated = np.array([(m.frequency_sd_hz, m.damping_sd) for m in modes])
    inside_hz = np.abs(frequency) < 1.96 * stated[:, 0]
    inside = np.abs(damping) * case.damping_ratio < 1.96 * stated[:, 1]
    assert inside_hz.mean() >= 0.88
    assert inside.mean() >= 0.88


@pytest.mark.parametrize("decrement", [0.05, 0.1, 0.2, 0.5, 1.0])
def test_log_decrement(decrement: float) -> None:
    """Peaks that fall by exp(-d) a cycle: zeta = d / sqrt(4 pi^2 + d^2) (closed form)."""
    expected = {0.05: 0.0079575, 0.1: 0.0159135, 0.2: 0.0318149, 0.5: 0.0793267, 1.0: 0.1571767}
    time_s = np.arange(4096) / RATE_HZ
    samples = np.exp(-decrement * 12.0 * time_s) * np.cos(2 * np.pi * 12.0 * time_s)
    mode = one_mode(samples, np.zeros(0))
    assert mode.damping_ratio == pytest.approx(expected[decrement], rel=1e-4)
    assert mode.frequency_hz * np.sqrt(1 - mode.damping_ratio**2) == pytest.approx(12.0, rel=1e-5)


@pytest.mark.parametrize("damping_ratio", [0.005, 0.01, 0.05])
def test_half_power_bandwidth(damping_ratio: float) -> None:
    """Half-power bandwidth over twice the frequency, of a fine transform of the same decay.

    Exact-peak half power of a displacement response returns 0.005000, 0.010001 and 0.050126.
    """
    expected = {0.005: 0.005000, 0.01: 0.010001, 0.05: 0.050126}[damping_ratio]
    omega = 2 * np.pi * 20.0
    decay, damped = damping_ratio * omega, omega * np.sqrt(1 - damping_ratio**2)
    time_s = np.arange(round(14 / decay * RATE_HZ)) / RATE_HZ
    samples = np.exp(-decay * time_s) * np.sin(damped * time_s)
    frequency_hz = np.linspace(20 * (1 - 3 * damping_ratio), 20 * (1 + 3 * damping_ratio), 12001)
    response = 1 / np.abs((decay + 2j * np.pi * frequency_hz) ** 2 + damped**2)
    above = frequency_hz[response >= response.max() / np.sqrt(2)]
    half_power = (above[-1] - above[0]) / (2 * 20.0)
    assert half_power == pytest.approx(expected, rel=1e-3)
    assert one_mode(samples, np.zeros(0)).damping_ratio == pytest.approx(half_power, rel=4e-3)


def by_log_decrement(samples: np.ndarray) -> float:
    """Ratio of damping from positive peaks, each at the top of a parabola through three samples.

    The peaks of exp(-at) sin(bt) fall by exp(-d) a cycle: zeta = d / sqrt(4 pi^2 + d^2).
    """
    before, here, after = samples[:-2], samples[1:-1], samples[2:]
    at = np.flatnonzero((here > before) & (here >= after) & (here > 1e-3 * samples.max()))
    slope, bend = (after[at] - before[at]) / 2, before[at] - 2 * here[at] + after[at]
    heights = here[at] - slope**2 / (2 * bend)
    decrement = np.log(heights[0] / heights[-1]) / (len(heights) - 1)
    return float(decrement / np.sqrt(4 * np.pi**2 + decrement**2))


def by_half_power(samples: np.ndarray, rate_hz: float, natural_hz: float, reach_hz: float) -> float:
    """Ratio of damping from where the transform falls to 1 / sqrt 2 of its peak.

    The transform of exp(-at) sin(bt) is a receptance, for which exactly
    f2^2 - f1^2 = 4 zeta sqrt(1 - zeta^2) fn^2.
    """
    from scipy.signal import zoom_fft

    band = (natural_hz - reach_hz, natural_hz + reach_hz)
    frequency_hz = np.linspace(*band, 2001)
    height = np.abs(zoom_fft(samples, band, 2001, fs=rate_hz, endpoint=True))
    above = np.flatnonzero(height >= height.max() / np.sqrt(2))
    first, last = above[0], above[-1]
    level = height.max() / np.sqrt(2)
    low_hz = np.interp(level, height[first - 1 : first + 1], frequency_hz[first - 1 : first + 1])
    high_hz = np.interp(level, height[last : last + 2][::-1], frequency_hz[last : last + 2][::-1])
    product = (high_hz**2 - low_hz**2) / (4 * natural_hz**2)
    return float(np.sqrt((1 - np.sqrt(1 - 4 * product**2)) / 2))


@pytest.mark.parametrize("damping_ratio", [0.001, 0.002, 0.005, 0.01, 0.02, 0.05, 0.1])
def test_three_ways_to_damping_agree(damping_ratio: float) -> None:
    """Log decrement, half power and the estimate from one and the same clean decay at 20 Hz.

    Allowed: parabolas for tops (1e-6) and lines between transform points (5e-5).
    """
    rate_hz, natural_hz = 2048.0, 20.0
    decay = damping_ratio * 2 * np.pi * natural_hz
    time_s = np.arange(round(12 / decay * rate_hz)) / rate_hz
    damped = 2 * np.pi * natural_hz * np.sqrt(1 - damping_ratio**2)
    samples = np.exp(-decay * time_s) * np.sin(damped * time_s)
    estimate = estimate_modes([TapRecord(samples, rate_hz, np.zeros(0))])
    assert len(estimate.modes) == 1
    mode = estimate.modes[0]
    assert mode.frequency_hz == pytest.approx(natural_hz, rel=1e-7)
    assert mode.damping_ratio == pytest.approx(damping_ratio, rel=1e-6)
    assert by_log_decrement(samples) == pytest.approx(mode.damping_ratio, rel=2e-6)
    reach_hz = 4 * damping_ratio * natural_hz
    assert by_half_power(samples, rate_hz, natural_hz, reach_hz) == pytest.approx(
        mode.damping_ratio, rel=5e-5
    )


@pytest.mark.parametrize("case", CASES[:3])
def test_exponential_window_is_taken_out(case: Case) -> None:
    """zeta = zeta_measured - 1 / (tau omega), within 2 % (impact-testing practice)."""
    tau_s = case.duration_s / np.log(100)
    rng = np.random.default_rng(3)
    samples = clean(case) + 0.1 * rng.standard_normal(round(case.duration_s * RATE_HZ))
    window = np.exp(-np.arange(len(samples)) / RATE_HZ / tau_s)
    measured = one_mode(samples * window, 0.03 * rng.standard_normal(2048))
    assert measured.damping_ratio is not None
    corrected = damping_without_window(measured.damping_ratio, tau_s, measured.frequency_hz)
    assert corrected == pytest.approx(case.damping_ratio, rel=0.02)


def test_window_that_ends_at_one_percent_adds_this_much() -> None:
    """20 Hz, 4 s, window down to 1 %: tau 0.8686 s adds 0.00916 (computed)."""
    assert damping_without_window(0.01916, 4.0 / np.log(100), 20.0) == pytest.approx(0.01, abs=2e-5)
