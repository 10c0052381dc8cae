"""A running recording read in blocks says what it says when held whole."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import scipy.signal
import soundfile

from fieldkit.errors import Cancelled, InputError, Refusal
from fieldkit.progress import Progress
from fieldkit.signal import long_running
from fieldkit.signal.block_health import BlockHealth
from fieldkit.signal.health import clipping, offset_and_drift, unsteady_level
from fieldkit.signal.long_running import power_density_in, read_running_in, what_was_read
from fieldkit.signal.read_ahead import ahead
from fieldkit.signal.recording import Channel, Recording
from fieldkit.signal.running import read_running
from fieldkit.signal.source import RecordingSource, held, open_recording
from fieldkit.signal.welch import Segments

RATE_HZ = 1000.0


@pytest.fixture(autouse=True)
def small_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    """So that a short record arrives in many blocks."""
    monkeypatch.setattr(long_running, "BLOCK_SAMPLES", 7001)


def source(signal: np.ndarray, full_scale: float | None = None) -> RecordingSource:
    channels = (Channel("a"),)
    return held(Recording(signal[:, None], RATE_HZ, channels, "made.wav", full_scale))


def machine(seconds: float = 300.0, seed: int = 3) -> np.ndarray:
    """Two steady lines, one that comes and goes, and noise."""
    rng = np.random.default_rng(seed)
    t = np.arange(int(seconds * RATE_HZ)) / RATE_HZ
    steady = 0.3 * np.sin(2 * np.pi * 24.63 * t) + 0.1 * np.sin(2 * np.pi * 98.5 * t)
    sos = scipy.signal.butter(2, [149.4, 150.6], "bandpass", fs=RATE_HZ, output="sos")
    stirred = scipy.signal.sosfilt(sos, rng.standard_normal(len(t)))
    return steady + 0.05 * stirred / stirred.std() + 1e-3 * rng.standard_normal(len(t))


@pytest.mark.parametrize("left_over", [0, 1, 333, 999])
@pytest.mark.parametrize("length", [1000, 1001, 4096])
def test_density_in_blocks_is_that_of_scipy_on_the_whole(length, left_over):
    """scipy.signal.welch is the outside reference; what is left at the end is in no segment."""
    signal = np.random.default_rng(1).standard_normal(40 * length + left_over) + 3.0
    frequency, ours = power_density_in(source(signal), length=length)
    expected_at, expected = scipy.signal.welch(
        signal, RATE_HZ, "hann", nperseg=length, noverlap=length // 2
    )
    np.testing.assert_allclose(frequency, expected_at, atol=1e-12)
    np.testing.assert_allclose(ours, expected, rtol=1e-10, atol=1e-10 * expected.max())


@pytest.mark.parametrize("block", [1, 7, 100, 350])
def test_segments_do_not_depend_on_how_the_record_arrives(block):
    record = np.arange(1000.0)
    cut = Segments(100, 24)
    found = [s.copy() for i in range(0, 1000, block) for s in cut.of(record[i : i + block])]
    expected = np.lib.stride_tricks.sliding_window_view(record, 100)[::24]
    np.testing.assert_array_equal(found, expected)


def test_picture_is_that_of_the_whole():
    """Lines, their levels, steadiness and the overall level, on five minutes either way."""
    signal = machine()
    options = {"quantity": "acceleration", "scale": 9.81}
    whole = read_running(signal, RATE_HZ, **options)
    ours = read_running_in(source(signal), **options)
    assert len(ours.lines) == len(whole.lines) >= 3
    for mine, reference in zip(ours.lines, whole.lines, strict=True):
        assert mine.frequency_hz == pytest.approx(reference.frequency_hz, abs=0.05)
        assert mine.rms == pytest.approx(reference.rms, rel=0.05)
        assert mine.steady == reference.steady
    for mine, reference in zip(ours.lines[:2], whole.lines[:2], strict=True):
        assert mine.frequency_hz == pytest.approx(reference.frequency_hz, rel=1e-6)
        assert mine.rms == pytest.approx(reference.rms, rel=1e-4)
    assert {line.steady for line in ours.lines} == {True, False}
    assert ours.overall_rms == pytest.approx(whole.overall_rms, rel=3e-3)
    assert ours.velocity_rms_m_per_s == pytest.approx(whole.velocity_rms_m_per_s, rel=3e-3)
    assert (ours.low_hz, ours.high_hz) == (whole.low_hz, whole.high_hz)
    assert ours.spectrum.unit == "m/s^2"
    assert ours.warnings == whole.warnings == ()


def test_overall_level_is_that_of_what_was_put_in():
    """Two sines and noise of known density between 2 Hz and the rate over 2.56."""
    picture = read_running_in(source(machine()))
    noise = 1e-6 * (RATE_HZ / 2.56 - 2.0) / (RATE_HZ / 2)
    expected = np.sqrt(0.3**2 / 2 + 0.1**2 / 2 + 0.05**2 + noise)
    assert picture.overall_rms == pytest.approx(expected, rel=2e-3)
    assert picture.velocity_rms_m_per_s is None


def awkward(seed: int) -> np.ndarray:
    """A record with an offset, a drift, a level that grows, and tops cut off, each by chance."""
    rng = np.random.default_rng(seed)
    count = int(rng.integers(20_000, 60_000))
    signal = rng.standard_normal(count) * (1 + (seed % 3) * np.arange(count) / count)
    if seed % 2:
        signal = np.clip(signal, -2.0, 2.5)
    if seed % 4 < 2:
        signal = signal + rng.uniform(-50, 50)
    return signal + (seed % 5) * np.linspace(-3, 3, count)


@pytest.mark.parametrize("seed", range(12))
def test_health_in_blocks_says_what_it_says_of_the_whole(seed):
    signal = awkward(seed)
    blocks = BlockHealth(len(signal), None)
    for i in range(0, len(signal), 1234):
        blocks.add(signal[i : i + 1234])
    vibration, on_offset = offset_and_drift(signal)
    assert blocks.warnings() == (*clipping(signal), *on_offset, *unsteady_level(vibration))


def test_rail_reached_in_one_minute_of_many_is_told():
    signal = machine(120.0)
    signal[50_000:60_000] = np.clip(9 * signal[50_000:60_000], -1.0, 1.0)
    picture = read_running_in(source(signal, full_scale=1.0))
    assert any("clipped in" in warning for warning in picture.warnings)
    assert any("level changes" in warning for warning in picture.warnings)


def test_silent_channel_and_impossible_band_are_refused():
    with pytest.raises(Refusal, match="the channel is silent"):
        read_running_in(source(np.full(50_000, 0.25)))
    with pytest.raises(InputError, match="a band from"):
        read_running_in(source(machine(10.0)), low_hz=600.0)
    with pytest.raises(InputError, match="no channel 2"):
        read_running_in(source(machine(10.0)), 2)


def test_progress_rises_and_a_wish_to_stop_is_heeded_at_the_next_block():
    told: list[float] = []

    def step(_message: str, fraction: float) -> None:
        told.append(fraction)

    read_running_in(source(machine(60.0)), progress=Progress(step))
    assert told == sorted(told)
    assert len(told) > 60_000 / 7001
    assert told[0] == 0.0
    assert 0.9 < told[-1] < 1.0
    told.clear()
    with pytest.raises(Cancelled):
        read_running_in(source(machine(60.0)), progress=Progress(step, lambda: len(told) >= 3))
    assert len(told) == 3


def test_note_says_what_the_answer_rests_on():
    note = what_was_read(source(machine(300.0)))
    assert note.startswith("read in blocks over its whole 5 min")
    assert "40 stretches of 2.5 s" in note


def test_file_on_disk_gives_what_its_samples_give(tmp_path: Path):
    signal = 0.5 * machine(60.0)
    path = tmp_path / "a.flac"
    soundfile.write(path, signal, int(RATE_HZ), subtype="PCM_24")
    from_file, made = read_running_in(open_recording(path)), read_running_in(source(signal))
    np.testing.assert_allclose(
        from_file.spectrum.amplitude, made.spectrum.amplitude, rtol=1e-3, atol=1e-8
    )
    assert [line.steady for line in from_file.lines] == [line.steady for line in made.lines]


def test_reading_ahead_keeps_the_order_and_passes_errors_on():
    def items():
        yield from range(5)
        raise InputError("broken", "mend it")

    seen: list[int] = []
    with pytest.raises(InputError, match="broken"):
        seen.extend(ahead(items()))
    assert seen == list(range(5))
    assert list(ahead(iter([]))) == []
