"""The waterfall of a recording that a job names."""

from __future__ import annotations

from fieldkit.job.document import RecordingEntry
from fieldkit.progress import Progress
from fieldkit.signal.recording import SI_UNIT
from fieldkit.signal.source import as_far_as_readable, open_recording
from fieldkit.signal.spectrum import SAMPLE_UNITS
from fieldkit.signal.waterfall import Waterfall, waterfall


def waterfall_of(entry: RecordingEntry, up_to_hz: float, progress: Progress) -> Waterfall:
    """Frequency against time of a running recording, in SI where it is calibrated.

    Raises InputError where the file cannot be read and Refusal where it is too short.
    """
    source = open_recording(entry.path, rate_hz=entry.rate_hz)
    channel = source.channels[min(entry.channel, len(source.channels)) - 1]
    quantity, scale = entry.quantity, entry.scale
    if scale is None and channel.scale is not None:
        quantity, scale = channel.quantity or entry.quantity, channel.scale
    unit = SI_UNIT[quantity] if scale is not None else SAMPLE_UNITS
    found, _ = as_far_as_readable(
        source,
        lambda whole: waterfall(
            whole,
            entry.channel,
            up_to_hz=up_to_hz,
            scale=scale if scale is not None else 1.0,
            unit=unit,
            progress=progress,
        ),
    )
    return found
