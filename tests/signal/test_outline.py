"""The outline of a recording loses no peak."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.outline import outline
from fieldkit.signal.recording import Channel, Recording
from fieldkit.signal.source import RecordingSource, held


def source(signal: np.ndarray) -> RecordingSource:
    return held(Recording(signal[:, None], 1000.0, (Channel("a"),), "made.wav", None))


@pytest.mark.parametrize("count", [10_001, 700_000, 1_000_003])
def test_every_peak_is_in_its_place(count):
    rng = np.random.default_rng(1)
    signal = rng.standard_normal(count)
    for at in rng.integers(0, count, 20):
        signal[at] = 50.0 * rng.choice([-1, 1])
    seen = outline(source(signal), 1, 4000)
    assert len(seen) <= 4000
    assert len(seen) > 1900
    for at in np.flatnonzero(np.abs(signal) == 50.0):
        where = int(at / count * len(seen))
        assert np.abs(seen[max(where - 4, 0) : where + 5]).max() == 50.0
    assert (seen.min(), seen.max()) == (signal.min(), signal.max())


def test_short_signal_is_its_own_outline():
    signal = np.arange(1000.0)
    np.testing.assert_array_equal(outline(source(signal), 1), signal)
