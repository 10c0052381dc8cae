"""The simulated recordings are what their truth says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.bench.accuracy.bound import recording_bound
from tests.bench.accuracy.kinds import KINDS, recording
from tests.bench.accuracy.recordings import Simulated, simulate
from tests.bench.accuracy.surroundings import Density, noise

QUIETLY = Density(((1e-16, 0.0),))
RINGING = ["quiet", "pair", "quick", "doubles", "chime", "short", "no-quiet"]


def without_noise(kind: str, seed: int) -> Simulated:
    """The modes of a recording alone."""
    rng = np.random.default_rng(seed)
    scene = replace(KINDS[kind](rng), density=QUIETLY, above=(), bits=0, peak=0.9)
    return simulate(scene, rng)


@pytest.mark.parametrize("kind", RINGING)
def test_decays_are_the_stated_modes_at_the_stated_amplitudes(kind: str) -> None:
    """From the end of the contact to the next blow, to a millionth of the peak or to the noise."""
    made = without_noise(kind, 3)
    noise_rms = np.sqrt(float(made.density.at(20.0)) * made.rate_hz / 2)
    assert made.usable
    for blow in made.usable:
        steps = np.arange(blow.end - blow.start)
        poles = np.array([mode.pole for mode in made.modes])
        waves = np.exp(np.outer(poles, steps / made.rate_hz))
        modelled = np.real(blow.amplitudes @ waves)
        left = made.samples[blow.start : blow.end] - modelled
        assert np.abs(left).max() < 1e-6 + 6 * noise_rms


def test_mode_has_the_energy_that_was_asked_for() -> None:
    """Energy over the noise of decays that ring out, within half a decibel."""
    rng = np.random.default_rng(4)
    scene = KINDS["noisy"](rng)
    bounds = recording_bound(simulate(replace(scene, bits=0), rng))
    stated = [bound.energy_db for bound in bounds]
    assert stated == pytest.approx(list(scene.energies_db), abs=0.5)


def test_noise_has_its_density() -> None:
    """Welch's estimate of a long stretch, within the scatter of its averages."""
    from scipy.signal import welch

    density = Density(((1.0, 1.5), (0.05, 0.0)), high_pass_hz=10.0, floor=1e-3)
    made = noise(np.random.default_rng(5), 400_000, 1000.0, density)
    frequency, power = welch(made, 1000.0, nperseg=2000)
    inside = (frequency > 3) & (frequency < 490)
    ratio = power[inside] / density.at(frequency[inside])
    assert np.mean(ratio) == pytest.approx(1.0, abs=0.02)
    assert np.std(ratio) < 0.1


def test_same_seed_is_the_same_recording() -> None:
    one, again, other = (recording("hum", seed) for seed in (7, 7, 8))
    assert np.array_equal(one.samples, again.samples)
    assert not np.array_equal(one.samples[:1000], other.samples[:1000])


@pytest.mark.parametrize("kind", ["doubles", "clipped"])
def test_spoilt_taps_are_in_the_recordings_that_are_named_for_them(kind: str) -> None:
    """Some spoilt, at least one left to estimate from, rails where it says so."""
    made = recording(kind, 1)
    spoilt = [blow.double if kind == "doubles" else blow.clipped for blow in made.blows]
    assert any(spoilt)
    assert made.usable
    if kind == "clipped":
        assert np.abs(made.samples).max() == pytest.approx(1.0, abs=1e-4)
