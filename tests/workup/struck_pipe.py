"""Recordings of a struck pipe on the disk: sensor on channel 1, hammer on channel 2."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from fieldkit.job.document import HammerEntry, RecordingEntry
from tests.signal.made_blows import HalfSine, Vibrating, two_channels

RATE_HZ = 4096
SENSOR = 50.0
"""m/s^2 per unit of sample."""
HAMMER = 434.0
"""N per unit of sample."""
MODES = (Vibrating(18.3, 0.012, 1 / 40), Vibrating(55.0, 0.012, 1 / 25))
BLOWS = tuple(HalfSine(2.0 + 4.8 * i, 60.0 + 20.0 * i) for i in range(3))


def write(
    path: Path,
    hits: Sequence[HalfSine] = BLOWS,
    *,
    modes: Sequence[Vibrating] = MODES,
    force_sign: float = 1.0,
    force_rail: float = 1.0,
    noise_m_per_s2: float = 0.01,
) -> Path:
    """A recording that ends five seconds after its last blow."""
    import soundfile

    duration_s = max(hit.at_s for hit in hits) + 5.0
    force, response = two_channels(
        modes, hits, duration_s, RATE_HZ, force_noise_n=0.05, noise_m_per_s2=noise_m_per_s2
    )
    pushed = np.clip(force_sign * force / HAMMER, -force_rail, force_rail)
    columns = np.column_stack([response / SENSOR, pushed])
    soundfile.write(path, columns, RATE_HZ, subtype="PCM_24")
    return path


def entry(path: Path, *, hammer: HammerEntry | None = None, **changes: object) -> RecordingEntry:
    """Struck at the sensor, both calibrated, unless said otherwise."""
    whole = RecordingEntry(
        path, "tap", "tapped", 1, scale=SENSOR, direction="vertical", at_m=1.9,
        hammer=hammer or HammerEntry(2, HAMMER, 1.92),
    )  # fmt: skip
    return replace(whole, **changes)  # type: ignore[arg-type]
