"""What a running recording too long for memory holds, read in blocks over its whole length."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.progress import Progress
from fieldkit.signal.block_health import BlockHealth
from fieldkit.signal.integration import CORNER_HZ
from fieldkit.signal.read_ahead import ahead
from fieldkit.signal.running import (
    RunningPicture,
    short_record,
    silent,
    upper_limit,
    velocity_rms,
)
from fieldkit.signal.source import RecordingSource
from fieldkit.signal.spectrum import (
    FLAT_TOP_OVERLAP,
    SAMPLE_UNITS,
    flat_top_spectrum,
    hann_density,
)
from fieldkit.signal.steadiness import (
    LONGEST_SEGMENT_S,
    MOST_SEGMENTS,
    holds,
    line_powers,
    segments_over,
)
from fieldkit.signal.steady_lines import RunningLine, clear_lines, tells
from fieldkit.signal.welch import PowerSum, SegmentPower, Segments, segment_length
from fieldkit.signal.windows import HANN, HFT90D

Real = NDArray[np.float64]

BLOCK_SAMPLES = 2**18
"""2 MiB at a time; a request to stop is heeded between two blocks."""
_READING = "reading a long recording"
_READ = 0.95


@dataclass(frozen=True)
class _Sums:
    """What one pass over the record leaves."""

    flat_top: SegmentPower
    hann: SegmentPower
    health: BlockHealth


def read_running_in(
    source: RecordingSource,
    channel: int = 1,
    *,
    quantity: str | None = None,
    scale: float | None = None,
    low_hz: float = CORNER_HZ,
    high_hz: float | None = None,
    progress: Progress | None = None,
) -> RunningPicture:
    """Spectrum, steady lines and overall RMS of one channel over the whole of a long recording.

    As ``read_running``, with two differences: the mean is removed segment by segment, and the
    overall RMS is the sum of the power density over the band. Memory does not grow with length.
    Raises what ``read_running`` raises, and Cancelled where progress says so.
    """
    progress = progress or Progress()
    high_hz, warnings = upper_limit(source.rate_hz, low_hz, high_hz)
    band = {"low_hz": low_hz, "high_hz": high_hz}
    sums = _summed(source, channel, low_hz, progress.within(0, _READ))
    if sums.health.silent:
        raise silent()
    spectrum = flat_top_spectrum(sums.flat_top, source.rate_hz, quantity=quantity, scale=scale)
    factor = 1.0 if scale is None or spectrum.unit == SAMPLE_UNITS else scale
    frequency_hz, density = hann_density(sums.hann, source.rate_hz, scale=factor)
    lines = clear_lines(sums.hann, spectrum, scale=factor, **band)
    return RunningPicture(
        spectrum=spectrum,
        lines=_told_steady(source, channel, lines, progress.within(_READ, 1)),
        overall_rms=band_rms(frequency_hz, density, **band),
        **band,
        warnings=(
            *warnings,
            *sums.health.warnings(),
            *short_record(source.duration_s, low_hz),
        ),
        velocity_rms_m_per_s=(
            velocity_rms(frequency_hz, density, quantity, **band)
            if scale is not None and quantity
            else None
        ),
    )


def power_density_in(
    source: RecordingSource,
    channel: int = 1,
    *,
    scale: float | None = None,
    length: int | None = None,
    progress: Progress | None = None,
) -> tuple[Real, Real]:
    """Frequencies (m,) in Hz and one-sided power density (m,) in unit^2/Hz, read in blocks.

    Welch's method with a Hann window and half overlap on segments of ``length`` samples, chosen
    from the length of the recording where left out; what is left at the end is in no segment.
    """
    length = length or segment_length(source.frames, source.rate_hz, CORNER_HZ)
    segments, power = Segments(length, length - length // 2), PowerSum(HANN, length)
    for block in _blocks(source, channel, progress or Progress()):
        for segment in segments.of(block):
            power.add(segment)
    return hann_density(power.mean(), source.rate_hz, scale=scale)


def what_was_read(source: RecordingSource) -> str:
    """What of a long running recording the answer rests on, in words for the user."""
    return (
        f"read in blocks over its whole {source.duration_s / 60:.0f} min: spectrum and levels are "
        f"averages over all of it; whether a line is steady was told from {MOST_SEGMENTS} "
        f"stretches of {LONGEST_SEGMENT_S:g} s spread over it"
    )


def band_rms(frequency_hz: Real, density: Real, *, low_hz: float, high_hz: float) -> float:
    """RMS between two frequencies, both included, by a power density (m,)."""
    kept = (frequency_hz >= low_hz) & (frequency_hz <= high_hz)
    return float(np.sqrt(density[kept].sum() * (frequency_hz[1] - frequency_hz[0])))


def _summed(source: RecordingSource, channel: int, low_hz: float, progress: Progress) -> _Sums:
    """One pass: flat-top segments at their overlap, every other of them with a Hann window too."""
    length = segment_length(source.frames, source.rate_hz, low_hz)
    segments = Segments(length, length - round(FLAT_TOP_OVERLAP * length))
    flat_top, hann = PowerSum(HFT90D, length), PowerSum(HANN, length)
    health = BlockHealth(source.frames, source.full_scale)
    count = 0
    for block in _blocks(source, channel, progress):
        health.add(block)
        for segment in segments.of(block):
            flat_top.add(segment)
            if count % 2 == 0:
                hann.add(segment)
            count += 1
    return _Sums(flat_top.mean(), hann.mean(), health)


def _blocks(source: RecordingSource, channel: int, progress: Progress) -> Iterator[Real]:
    done = 0
    for block in ahead(source.blocks(channel, BLOCK_SAMPLES)):
        progress.step(_READING, done / source.frames)
        yield block
        done += len(block)


def _told_steady(
    source: RecordingSource,
    channel: int,
    found: Sequence[tuple[RunningLine, float]],
    progress: Progress,
) -> tuple[RunningLine, ...]:
    """The lines, told steady or not where that can be told, by one more look at short segments."""
    telling = [line for line, apart_hz in found if tells(line, apart_hz, source.duration_s)]
    if not telling:
        return tuple(line for line, _ in found)
    segments = _spread_segments(source, channel, progress)
    powers = line_powers(segments, source.rate_hz, [line.frequency_hz for line in telling])
    steady = {line: holds(powers[:, i]) for i, line in enumerate(telling)}
    return tuple(replace(line, steady=steady.get(line)) for line, _ in found)


def _spread_segments(source: RecordingSource, channel: int, progress: Progress) -> Iterator[Real]:
    starts, n = segments_over(source.frames, source.rate_hz)
    with source.reading(channel) as read:
        for i, start in enumerate(starts):
            progress.step(_READING, i / len(starts))
            yield read(int(start), int(start) + n)
