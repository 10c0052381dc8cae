"""The live spectrum: amplitude, pace and cost."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.capture.live import LiveSpectrum, order_frequencies
from fieldkit.capture.source import Block

RATE_HZ = 48000


def heard(live: LiveSpectrum, signal: np.ndarray, size: int = 1024, first: int = 0) -> int:
    """Feed a signal in blocks; the number of pictures that came."""
    seen = set()
    for at in range(0, len(signal), size):
        part = signal[at : at + size].astype(np.float32)[:, None]
        live.feed(Block(first + at, part))
        seen.add(live.picture.number if live.picture else 0)
    return len(seen - {0})


def sines(seconds: float, *pairs: tuple[float, float], rate_hz: int = RATE_HZ) -> np.ndarray:
    time_s = np.arange(round(seconds * rate_hz)) / rate_hz
    waves = [np.sqrt(2) * rms * np.sin(2 * np.pi * hz * time_s) for hz, rms in pairs]
    return np.sum(waves, axis=0)


def test_a_steady_sine_reads_its_rms_and_what_lies_above_does_not_fold_in() -> None:
    """HFT90D reads within 0.0039 dB; 3 kHz and its images stay below -70 dB of the band."""
    live = LiveSpectrum(rate_hz=RATE_HZ, quantity="acceleration", scale=50.0)
    heard(live, sines(6, (24.7, 0.02), (3000.0, 0.1)))
    picture = live.picture
    assert picture is not None
    near = np.abs(picture.frequency_hz - 24.7) < 2
    assert picture.now[near].max() == pytest.approx(1.0, rel=2e-3)
    assert picture.now[~near & (picture.frequency_hz > 30)].max() < 5.0 * 10 ** (-70 / 20)
    assert picture.unit == "m/s^2"
    assert picture.overall == pytest.approx(50 * np.hypot(0.02, 0.1), rel=1e-3)


def test_more_than_ten_pictures_a_second() -> None:
    """Whatever the size of the blocks up to a twentieth of a second."""
    live = LiveSpectrum(rate_hz=RATE_HZ)
    heard(live, sines(1, (20.0, 0.1)))
    assert heard(live, sines(2, (20.0, 0.1)), size=2400, first=RATE_HZ) >= 20


def test_the_transform_is_as_short_at_any_rate() -> None:
    """The cost is bounded by what is shown, not by the rate."""
    lengths = []
    for rate_hz in (2000, 48000, 192000):
        live = LiveSpectrum(rate_hz=rate_hz)
        heard(live, sines(5, (20.0, 0.1), rate_hz=rate_hz), size=rate_hz // 20)
        assert live.picture is not None
        lengths.append(len(live.picture.frequency_hz))
    assert max(lengths) < 1100


def test_order_lines_stand_at_multiples_of_the_speed_with_their_level() -> None:
    """1480 rpm: 24.67 Hz and its double; a sixth order beyond the picture is left out."""
    live = LiveSpectrum(rate_hz=RATE_HZ, top_hz=100.0)
    live.set_orders(1480.0, (1, 2, 6))
    heard(live, sines(6, (1480 / 60, 0.05), (2 * 1480 / 60, 0.02)))
    assert live.picture is not None
    first, second = live.picture.order_lines
    assert (first.frequency_hz, second.frequency_hz) == pytest.approx((24.6667, 49.3333), abs=1e-3)
    assert (first.level, second.level) == pytest.approx((0.05, 0.02), rel=5e-3)
    assert order_frequencies(1480.0, (6,), 100.0) == ()


def test_what_lies_before_a_gap_is_forgotten() -> None:
    """A spliced spectrum would show steps that were never there."""
    live = LiveSpectrum(rate_hz=2000)
    heard(live, sines(4, (20.0, 0.5), rate_hz=2000), size=100)
    live.feed(Block(8000, np.zeros((2000, 1), np.float32), lost_frames=10))
    assert live.picture is not None
    assert live.picture.overall == pytest.approx(0.0, abs=1e-6)
