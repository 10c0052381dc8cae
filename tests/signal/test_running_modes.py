"""Natural frequencies and damping from running vibration, against simulated truth."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest
from numpy.typing import NDArray

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.modes import MeasuredMode, ModeEstimate
from fieldkit.signal.running_modes import estimate_running_modes
from tests.signal.made_running import machine, stirred

Real = NDArray[np.float64]
RATE_HZ = 600.0
FOUR = ((12.3, 0.012), (31.0, 0.008), (47.5, 0.015), (88.0, 0.01))
COUNT = int(60 * RATE_HZ)


def estimate(signal: Real, rate_hz: float = RATE_HZ) -> ModeEstimate:
    """Modes from 3 to 120 Hz."""
    return estimate_running_modes(signal, rate_hz, low_hz=3.0, high_hz=120.0)


def at(modes: Sequence[MeasuredMode], frequency_hz: float, damping: float) -> MeasuredMode:
    """The mode within a bandwidth of the truth."""
    near = [m for m in modes if abs(m.frequency_hz - frequency_hz) < 2 * damping * frequency_hz]
    assert len(near) == 1, f"{len(near)} modes at {frequency_hz} Hz"
    return near[0]


def deviations(
    modes: Sequence[MeasuredMode], truth: Sequence[tuple[float, float]] = FOUR
) -> list[tuple[float, float]]:
    """Error of frequency and damping over the stated standard deviation."""
    found = [(at(modes, f, z), f, z) for f, z in truth]
    return [
        ((m.frequency_hz - f) / m.frequency_sd_hz, (m.damping_ratio - z) / m.damping_sd)
        for m, f, z in found
        if m.damping_ratio is not None and m.damping_sd is not None
    ]


@pytest.fixture(scope="module")
def eight() -> list[ModeEstimate]:
    """White or coloured force, quiet or as much noise as vibration, two records each."""
    kinds = [{}, {"colour_hz": 25.0}, {"noise": 1.0}, {"noise": 0.3}] * 2
    return [estimate(stirred(FOUR, seed=seed, **kind)) for seed, kind in enumerate(kinds)]


def test_finds_every_mode_and_nothing_else_with_intervals_that_hold(
    eight: list[ModeEstimate],
) -> None:
    """Of 64 values 95 % intervals miss 3.2 on average, and 8 or more once in 100 such tests."""
    assert [len(found.modes) for found in eight] == [4] * 8
    off = [abs(value) for found in eight for pair in deviations(found.modes) for value in pair]
    assert sum(value > 1.96 for value in off) <= 7
    assert max(off) < 4.5


def test_neither_frequency_nor_damping_is_biased(eight: list[ModeEstimate]) -> None:
    """The mean over eight records is the truth to within three deviations of that mean."""
    errors = [deviations(found.modes) for found in eight]
    assert np.all(np.abs(np.mean(errors, axis=0)) < 3 / np.sqrt(8))


def test_damping_is_as_sure_as_the_record_allows() -> None:
    """Nothing beats sd(damping)/damping = 1 / sqrt(sigma T) of a damped complex oscillation.

    Maximum likelihood of an Ornstein-Uhlenbeck process seen for T: variance of the decay rate
    sigma / T (Kutoyants 2004, Statistical Inference for Ergodic Diffusion Processes, from memory).
    What lies under the mode has to be found too: up to 2.5 times as much.
    """
    modes = estimate(stirred(FOUR, seed=40)).modes
    for frequency_hz, damping in FOUR:
        found = at(modes, frequency_hz, damping)
        assert found.damping_ratio is not None
        assert found.damping_sd is not None
        bound = 1 / np.sqrt(2 * np.pi * frequency_hz * damping * 60)
        assert 1.0 < found.damping_sd / found.damping_ratio / bound < 2.5
        assert 0.6 < found.frequency_sd_hz / frequency_hz / damping / bound < 2.5


@pytest.mark.parametrize("wander", [0.0, 5e-4])
def test_machine_lines_are_no_modes_and_spare_the_modes_beside_them(wander: float) -> None:
    """Orders on the back of a mode and elsewhere, steady or wandering by 0.05 %."""
    lines = ((24.5, 1.4), (31.1, 1.4), (46.6, 1.0), (88.6, 2.0), (49.0, 0.7))
    signal = stirred(FOUR, seed=7) + machine(lines, COUNT, seed=8, wander=wander)
    found = estimate(signal)
    assert len(found.modes) == 4
    assert np.max(np.abs(deviations(found.modes))) < 3.5
    tones = [tone.frequency_hz for tone in found.tones]
    assert sum(min(abs(t - f) for t in tones) < 0.1 for f, _ in lines) >= 4


@pytest.mark.parametrize("wander", [0.0, 5e-4, 1e-3])
def test_lines_only_are_refused_with_what_to_do(wander: float) -> None:
    """Where nothing broadband shakes the pipe there is no natural frequency to be had."""
    lines = ((24.5, 1.0), (49.0, 0.5), (50.0, 0.2), (98.0, 0.3))
    noise = 0.01 * np.random.default_rng(3).standard_normal(COUNT)
    with pytest.raises(Refusal, match=r"machine lines only.*tap the pipe"):
        estimate(machine(lines, COUNT, seed=2, wander=wander) + noise)


def test_lines_without_any_noise_are_refused() -> None:
    """Arithmetic leftovers are not taken for a background."""
    with pytest.raises(Refusal, match="machine lines only"):
        estimate(machine(((24.5, 1.0), (49.0, 0.5)), COUNT, seed=2))


@pytest.mark.parametrize("seed", range(4))
def test_nothing_is_claimed_in_noise(seed: int) -> None:
    """White, or coloured by broad humps that no pipework makes."""
    white = stirred((), seed=seed)
    humps = stirred(((20.0, 0.4), (60.0, 0.3)), seed=seed, noise=0.3)
    assert estimate(white).modes == ()
    assert estimate(humps).modes == ()


def test_a_level_that_swells_widens_the_intervals() -> None:
    """Uneven forces say less than even ones of the same length."""
    even = estimate(stirred(FOUR, seed=11)).modes
    uneven = estimate(stirred(FOUR, seed=11, swell=0.9)).modes
    wider = [at(uneven, f, z).frequency_sd_hz / at(even, f, z).frequency_sd_hz for f, z in FOUR]
    assert np.median(wider) > 1.1
    assert np.max(np.abs(deviations(uneven))) < 3.5


def test_what_is_there_in_one_half_only_is_refused() -> None:
    """A mode of something that was only then switched on, or a passing event."""
    passing = stirred(((47.5, 0.01),), seed=5, noise=0.0)
    passing[: COUNT // 2] = 0.0
    found = estimate(stirred(((20.0, 0.01),), seed=6, noise=0.5) + passing)
    assert [round(m.frequency_hz) for m in found.modes] == [20]
    reasons = [r.reason for r in found.refused if abs(r.frequency_hz - 47.5) < 1]
    assert any("half" in reason or "halves" in reason for reason in reasons)


def test_two_modes_apart_by_two_bandwidths_are_two() -> None:
    """The two planes of a pipe are nearly always a pair."""
    pair = ((40.0, 0.01), (41.6, 0.01))
    found = estimate(stirred(pair, seed=21, duration_s=90.0)).modes
    assert len(found) == 2
    assert np.max(np.abs(deviations(found, pair))) < 3.5


def test_rate_does_not_matter() -> None:
    """16 times the rate gives the same modes; filters cost a moment at both ends of the record."""
    from scipy.signal import resample

    slow = stirred(FOUR, seed=31, duration_s=32.0)
    fast = resample(slow, 16 * len(slow))
    for a, b in zip(estimate(slow).modes, estimate(fast, 16 * RATE_HZ).modes, strict=True):
        assert abs(a.frequency_hz - b.frequency_hz) < 0.7 * a.frequency_sd_hz


@pytest.mark.parametrize("factor", [1e-9, 1e6])
def test_level_does_not_matter(factor: float) -> None:
    """Sample units or metres per second squared give the same modes and the same doubt."""
    signal = stirred(FOUR, seed=33, duration_s=40.0)
    for a, b in zip(estimate(signal).modes, estimate(factor * signal).modes, strict=True):
        assert b.frequency_hz == pytest.approx(a.frequency_hz, rel=1e-6)
        assert b.damping_sd == pytest.approx(a.damping_sd, rel=1e-3)


def test_modes_say_where_they_come_from() -> None:
    """Running modes are seen in no tap, and marked."""
    mode = estimate(stirred(((30.0, 0.01),), seed=1)).modes[0]
    assert (mode.source, mode.taps, mode.strength) == ("running", 0, 1.0)


def test_short_silent_and_broken_records_are_turned_away() -> None:
    """Each with what to do instead."""
    with pytest.raises(Refusal, match=r"too short.*30 s"):
        estimate(stirred(FOUR, seed=1, duration_s=29.0))
    with pytest.raises(Refusal, match="silent"):
        estimate(np.zeros(COUNT))
    with pytest.raises(InputError, match="not finite"):
        estimate(np.full(COUNT, np.nan))
    with pytest.raises(InputError, match="range"):
        estimate_running_modes(np.ones(COUNT), RATE_HZ, low_hz=5.0, high_hz=400.0)
