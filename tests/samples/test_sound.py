"""What the simulated accelerometer hears obeys the closed form of a damped mode."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
import soundfile
from plants import GLYCOL_BOOSTER, Hit
from sound import blow, modal_acceleration, thinned, write_flac


def test_free_decay_after_a_blow_follows_its_closed_form() -> None:
    """q'' = Im(s^2 F(s) e^(s t)) / w_d with s = -zeta w + i w_d, once the hammer has left."""
    rate, frequency, zeta = 16000, 52.0, 0.013
    time = np.arange(rate) / rate
    hit = Hit(0.01, 300.0, 3e-3)
    force = blow(time, hit)
    found = modal_acceleration(
        np.array([frequency]), np.array([zeta]), np.array([0.5]), force, 1 / rate
    )
    omega = 2 * math.pi * frequency
    damped = omega * math.sqrt(1 - zeta**2)
    s = complex(-zeta * omega, damped)
    transform = np.sum(force * np.exp(-s * time)) / rate
    free = time > hit.at_s + hit.contact_s + 1 / rate
    expected = 0.5 * np.imag(s**2 * transform * np.exp(s * time[free])) / damped
    assert found[free] == pytest.approx(expected, abs=1e-3 * np.max(np.abs(expected)))


def test_a_bounce_strikes_again_with_two_fifths_of_the_force() -> None:
    time = np.arange(0.0, 0.2, 1e-5)
    force = blow(time, Hit(0.02, 100.0, 2e-3, again_after_s=0.05))
    first, second = force[time < 0.06], force[time > 0.06]
    assert np.max(first) == pytest.approx(100.0, rel=1e-3)
    assert np.max(second) == pytest.approx(40.0, rel=1e-3)
    assert time[time > 0.06][np.argmax(second)] == pytest.approx(0.071, abs=2e-5)


def test_thinning_keeps_a_low_tone_in_place_and_takes_a_high_one_away() -> None:
    time = np.arange(8000) / 16000
    low, high = np.sin(2 * np.pi * 100 * time), np.sin(2 * np.pi * 3900 * time)
    middle = slice(200, 1800)
    assert thinned(low, 4)[middle] == pytest.approx(low[::4][middle], abs=1e-2)
    assert np.max(np.abs(thinned(high, 4)[middle])) < 1e-2


@pytest.mark.parametrize("bits", [16, 24])
def test_the_converter_rounds_and_clips_at_its_rail(bits: int, tmp_path: Path) -> None:
    signal = np.array([0.0, 0.5, 3.0, -3.0])
    write_flac(tmp_path / "x.flac", signal, 4000, bits, full_scale=2.0)
    samples, rate = soundfile.read(tmp_path / "x.flac")
    assert rate == 4000
    assert soundfile.info(tmp_path / "x.flac").subtype == f"PCM_{bits}"
    assert samples == pytest.approx([0.0, 0.25, 1.0, -1.0], abs=2 ** (1 - bits))


def test_every_session_waits_before_the_first_blow() -> None:
    assert all(tap.hits[0].at_s >= 1.5 for tap in GLYCOL_BOOSTER.taps)
