"""The transforms of a drifting decay, and their derivatives."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from fieldkit.signal.background import NoiseDensity
from fieldkit.signal.bands import Band, band, combined
from fieldkit.signal.bending import changed
from fieldkit.signal.powers import Powers
from fieldkit.signal.traces import Component, Trace, bent_weights, component, sampled

RATE_HZ = 1000.0
SCALE = 0.5


def made(lengths: tuple[int, ...]) -> tuple[list[Trace], Band, Component]:
    """Three taps of flat noise density, a band of them, and a drifting decay."""
    flat = NoiseDensity(np.array([1.0, 500.0]), np.full(2, 1e-4))
    part = component(complex(-2.0, 2 * np.pi * 30), 3)
    part = replace(part, amplitudes=np.array([1 + 0.5j, 0.3 - 0.2j, 2j]), bend=0.7)
    traces = [
        Trace(sampled(part, tap, count, RATE_HZ), RATE_HZ, flat)
        for tap, count in enumerate(lengths)
    ]
    return traces, band(traces, 20.0, 40.0, 4.0), part


def model(bins: Band, part: Component) -> NDArray[np.complex128]:
    """(K, B) of the decay at its amplitudes."""
    weights = bent_weights(part)
    pair = Powers.of(bins, part, len(weights)).pair(weights)
    return combined(pair, part.amplitudes[None, :, None])[0]


@pytest.mark.parametrize("lengths", [(4000, 4000, 4000), (4000, 3000, 2500)])
def test_a_drifting_decay_transforms_as_its_samples_do(lengths: tuple[int, ...]) -> None:
    """The series gives what a Fourier transform of the samples gives, to rounding."""
    _, bins, part = made(lengths)
    np.testing.assert_allclose(
        model(bins, part), bins.data, atol=1e-10 * float(np.abs(bins.data).max())
    )


@pytest.mark.parametrize("lengths", [(4000, 4000, 4000), (4000, 3000, 2500)])
@pytest.mark.parametrize("number", [0, 1, 2])
def test_slopes_are_the_derivatives(lengths: tuple[int, ...], number: int) -> None:
    """Each slope is the central difference of the model by the same parameter."""
    _, bins, part = made(lengths)
    weights = bent_weights(part)
    slope = Powers.of(bins, part, len(weights)).slopes(part, weights, SCALE)[number]
    step = 1e-6 * np.eye(3)[number]
    ahead, behind = (model(bins, changed(part, move, SCALE)) for move in (step, -step))
    difference = (ahead - behind) / 2e-6
    np.testing.assert_allclose(slope, difference, atol=1e-6 * float(np.abs(difference).max()))
