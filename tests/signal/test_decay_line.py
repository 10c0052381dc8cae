"""The envelope drawn over a tap touches the crests of a decay that is known."""

import numpy as np
import pytest

from fieldkit.signal.decay_line import decay_height

RATE_HZ, FREQUENCY_HZ = 2000.0, 23.0
TIME_S = np.arange(6000) / RATE_HZ


@pytest.mark.parametrize("damping", [0.005, 0.01, 0.03])
@pytest.mark.parametrize("noise", [0.0, 0.01])
def test_the_height_is_that_of_the_decay(damping, noise):
    """x = 0.7 exp(-zeta w t) sin(w t): the envelope starts at 0.7."""
    decay = damping * 2 * np.pi * FREQUENCY_HZ
    rng = np.random.default_rng(1)
    x = 0.7 * np.exp(-decay * TIME_S) * np.sin(2 * np.pi * FREQUENCY_HZ * TIME_S)
    x += noise * rng.standard_normal(len(x))
    assert decay_height(x, RATE_HZ, decay) == pytest.approx(0.7, rel=0.1)


def test_silence_has_no_decay():
    assert decay_height(np.zeros(1000), RATE_HZ, 1.0) is None
    assert decay_height(np.ones(3), RATE_HZ, 1.0) is None
