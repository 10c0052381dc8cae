"""A long recording at a lower rate is what lowering the rate of the whole gives."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.errors import Cancelled
from fieldkit.progress import Progress
from fieldkit.signal import long_decimation
from fieldkit.signal.decimation import decimate
from fieldkit.signal.long_decimation import decimated
from fieldkit.signal.recording import Channel, Recording
from fieldkit.signal.source import RecordingSource, held

RATES = {"keep_hz": 200.0, "wanted_rate_hz": 1000.0}


@pytest.fixture(autouse=True)
def small_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(long_decimation, "BLOCK_SAMPLES", 5000)


def source(signal: np.ndarray, rate_hz: float) -> RecordingSource:
    return held(Recording(signal[:, None], rate_hz, (Channel("a"),), "made.wav", None))


@pytest.mark.parametrize("rate_hz", [2000.0, 8000.0, 11025.0, 48000.0])
@pytest.mark.parametrize("count", [40_000, 61_234])
def test_blocks_join_without_a_seam(rate_hz, count):
    """Sample for sample, but for what less than a few filters hold at the end."""
    signal = np.random.default_rng(2).standard_normal(count)
    whole, whole_hz = decimate(signal, rate_hz, **RATES)
    ours, ours_hz = decimated(source(signal, rate_hz), 1, **RATES)
    assert ours_hz == whole_hz
    assert 0 <= len(whole) - len(ours) < 0.05 * whole_hz + 5
    np.testing.assert_allclose(ours, whole[: len(ours)], atol=1e-12)


def test_rate_that_is_low_enough_is_kept():
    signal = np.random.default_rng(2).standard_normal(3000)
    ours, rate_hz = decimated(source(signal, 1500.0), 1, **RATES)
    assert rate_hz == 1500.0
    np.testing.assert_array_equal(ours, signal)


def test_wish_to_stop_is_heeded():
    with pytest.raises(Cancelled):
        decimated(
            source(np.zeros(40_000), 8000.0), 1, **RATES, progress=Progress(stop=lambda: True)
        )
