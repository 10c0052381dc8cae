"""The force of a blow: contact, second hits, spectrum against the closed form of a half sine."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.signal.hammer import (
    ForceSpectrum,
    Pulse,
    around,
    dips_hz,
    fallen_at,
    force_alone,
    force_spectrum,
    read_pulse,
)
from tests.signal.made_blows import HalfSine

RATE_HZ = 8192.0


def channel(*hits: HalfSine, noise: float = 0.0, seed: int = 0, rest: float = 0.0) -> np.ndarray:
    """Two seconds of a force channel."""
    time_s = np.arange(round(2 * RATE_HZ)) / RATE_HZ
    force = sum((hit.force(time_s) for hit in hits), start=np.full(len(time_s), rest))
    return force + noise * np.random.default_rng(seed).standard_normal(len(time_s))


def pulse_at(
    force: np.ndarray, rate_hz: float = RATE_HZ, at_s: float = 0.5, full_scale: float | None = None
) -> Pulse | None:
    """The pulse of a blow that the sensor shows at ``at_s``."""
    first, past = around(at_s, len(force) / rate_hz, rate_hz)
    return read_pulse(force[first:past], rate_hz, first, full_scale=full_scale)


def spectrum_of(force: np.ndarray, pulse: Pulse | None, rate_hz: float = RATE_HZ) -> ForceSpectrum:
    assert pulse is not None
    contact = force_alone(force[pulse.first : pulse.end], pulse, pulse.first)
    return force_spectrum([contact], rate_hz)


def half_sine_spectrum(frequency_hz: np.ndarray, contact_s: float) -> np.ndarray:
    """|cos(pi f T) / (1 - (2 f T)^2)|: transform of a half sine of length T over its impulse."""
    x = frequency_hz * contact_s
    return np.abs(np.cos(np.pi * x) / (1 - 4 * x**2))


def test_the_contact_is_found_to_a_few_samples() -> None:
    """Nothing of the force lies outside, and the free decay may start right behind it."""
    force = channel(HalfSine(0.5, 100.0, 0.004), noise=0.05)
    pulse = pulse_at(force)
    assert pulse is not None
    assert 0 <= 0.5 * RATE_HZ - pulse.first < 5
    assert 0 <= pulse.end - 0.504 * RATE_HZ < 5
    assert pulse.peak == pytest.approx(100.0, rel=0.01)
    assert len(pulse.hits) == 1
    assert pulse.clipped == 0
    assert pulse.contact == pytest.approx(0.004 * RATE_HZ, abs=2)


def test_the_blow_may_reach_the_sensor_later() -> None:
    """Bending waves of low frequency take some tens of milliseconds along a pipe."""
    force = channel(HalfSine(0.5), noise=0.05)
    early, late = pulse_at(force, at_s=0.53), pulse_at(force)
    assert early is not None
    assert late is not None
    assert abs(early.first - late.first) <= 2
    assert abs(early.end - late.end) <= 2


def test_a_push_that_reads_negative_is_found_with_its_sign() -> None:
    """And an offset of the channel is no force."""
    force = channel(HalfSine(0.5), noise=0.05)
    plain, turned = (pulse_at(f) for f in (force, 3.0 - force))
    assert plain is not None
    assert turned is not None
    assert turned.peak == pytest.approx(-plain.peak, rel=1e-3)
    assert (turned.first, turned.end) == (plain.first, plain.end)
    alone = [force_alone(f, p, 0) for f, p in ((force, plain), (3.0 - force, turned))]
    assert alone[1] == pytest.approx(-alone[0], abs=0.1)


@pytest.mark.parametrize("force", [channel(noise=0.05), channel(), channel(rest=2.0)])
def test_a_channel_without_a_blow_has_none(force: np.ndarray) -> None:
    assert pulse_at(force) is None


def test_a_blow_at_the_very_end_is_no_error() -> None:
    assert pulse_at(channel(), at_s=1.9999) is None
    assert pulse_at(channel(), at_s=2.5) is None


@settings(max_examples=60, deadline=None)
@given(
    gap_s=st.floats(0.008, 0.29),
    share=st.floats(0.13, 2.0),
    contact_s=st.floats(0.002, 0.006),
    seed=st.integers(0, 9),
)
def test_every_second_hit_is_told_with_its_place(
    gap_s: float, share: float, contact_s: float, seed: int
) -> None:
    """From just after the contact to 0.3 s later, from an eighth of the first to twice as hard."""
    hits = HalfSine(0.5, 100.0, contact_s), HalfSine(0.5 + gap_s, 100.0 * share, contact_s)
    pulse = pulse_at(channel(*hits, noise=0.1, seed=seed))
    assert pulse is not None
    first, second = pulse.hits
    assert second.after_s - first.after_s == pytest.approx(gap_s, abs=0.0015)
    assert second.share / first.share == pytest.approx(share, rel=0.03)


@settings(max_examples=60, deadline=None)
@given(contact_s=st.floats(0.0006, 0.02), noise=st.floats(0.0, 1.5), seed=st.integers(0, 99))
def test_one_hit_is_never_told_as_two(contact_s: float, noise: float, seed: int) -> None:
    """Hard and soft tips, noise up to 1.5 % of the force."""
    force = channel(HalfSine(0.5, 100.0, contact_s), noise=noise, seed=seed)
    pulse = pulse_at(force)
    assert pulse is not None
    assert len(pulse.hits) == 1


def test_two_hits_that_run_into_each_other_are_two() -> None:
    """The force need not fall to nothing between them."""
    force = channel(HalfSine(0.5, 100.0, 0.004), HalfSine(0.5036, 80.0, 0.004))
    pulse = pulse_at(force)
    assert pulse is not None
    assert len(pulse.hits) == 2


def test_a_faint_second_hit_belongs_to_the_force() -> None:
    """Too weak to spoil the blow, yet the decay is free only after it."""
    force = channel(HalfSine(0.5), HalfSine(0.54, 6.0), noise=0.01)
    pulse = pulse_at(force)
    assert pulse is not None
    assert len(pulse.hits) == 1
    assert pulse.end >= 0.5437 * RATE_HZ


def test_a_force_at_the_rail_is_clipped() -> None:
    force = np.clip(channel(HalfSine(0.5), noise=0.02), -60.0, 60.0) / 60.0
    pulse = pulse_at(force, full_scale=1.0)
    assert pulse is not None
    assert pulse.clipped > 10


@pytest.mark.parametrize("contact_s", [0.001, 0.004, 0.012])
def test_the_spectrum_is_that_of_a_half_sine(contact_s: float) -> None:
    """Transform of a half sine of length T: impulse 2 F T / pi at 0, first zero at 1.5 / T."""
    hit = HalfSine(0.5, 100.0, contact_s)
    force = np.array(hit.force(np.arange(48000) / 48000.0))
    pulse = pulse_at(force, 48000.0)
    assert pulse is not None
    found = spectrum_of(force, pulse, 48000.0)
    assert found.amplitude[0] == pytest.approx(2 * 100.0 * contact_s / np.pi, rel=2e-3)
    near = np.abs(found.frequency_hz * contact_s - 1.5) < 0.3
    zero_hz = found.frequency_hz[near][np.argmin(found.amplitude[near])]
    assert zero_hz == pytest.approx(1.5 / contact_s, rel=0.02)
    low = (found.frequency_hz * contact_s < 1.2) & (
        np.abs(found.frequency_hz * contact_s - 0.5) > 0.05
    )
    expected = half_sine_spectrum(found.frequency_hz[low], contact_s)
    assert found.amplitude[low] / found.amplitude[0] == pytest.approx(expected, abs=5e-3)


def test_the_force_is_usable_to_where_it_has_fallen_20_db() -> None:
    """|cos(pi x) / (1 - 4 x^2)| = 0.1 has its first root at x = f T = 1.303."""
    from scipy.optimize import brentq

    root = brentq(lambda x: half_sine_spectrum(np.array([x]), 1.0)[0] - 0.1, 1.0, 1.45)
    force = channel(HalfSine(0.5, 100.0, 0.005), noise=0.01)
    pulse = pulse_at(force)
    assert pulse is not None
    usable_hz = spectrum_of(force, pulse).usable_to_hz
    assert usable_hz == pytest.approx(root / 0.005, rel=0.02)


def test_a_force_that_nowhere_falls_has_no_limit() -> None:
    """A single sample is an impulse."""
    assert fallen_at(np.arange(9.0), np.ones(9)) is None
    assert fallen_at(np.arange(3.0), np.array([1.0, 0.2, 0.0])) == pytest.approx(1.5)


def test_two_hits_leave_dips_at_odd_multiples() -> None:
    """1 + exp(-i w d) vanishes at f = (2 k + 1) / (2 d); half as hard, the comb is 1.5 to 0.5."""
    assert dips_hz(0.025, 110.0) == pytest.approx((20.0, 60.0, 100.0))
    force = channel(HalfSine(0.5, 100.0, 0.002), HalfSine(0.525, 50.0, 0.002))
    pulse = pulse_at(force)
    assert pulse is not None
    found = spectrum_of(force, pulse)
    at = np.interp([20.0, 40.0, 60.0], found.frequency_hz, found.amplitude)
    assert at[0] / at[1] == pytest.approx(1 / 3, rel=0.03)
    assert at[2] / at[1] == pytest.approx(1 / 3, rel=0.05)
