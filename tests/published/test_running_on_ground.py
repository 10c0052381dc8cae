"""No running mode is claimed in real ground motion, where no pipe is.

Records carried by the obspy package among its test data.
"""

from __future__ import annotations

import pytest

from fieldkit.signal.running_modes import estimate_running_modes
from tests.published.outside import seismic_traces

STATION = ("io", "mseed", "tests", "data", "timingquality.mseed")
"""Station BW.BGLD, east, 200 Hz, 208 s, with 50 Hz mains."""
QUIET = ("io", "gse2", "tests", "data", "loc_RJOB20050831023349.z")
"""Station RJOB, vertical, 200 Hz, 60 s of quiet ground."""


@pytest.mark.parametrize("parts", [STATION, QUIET], ids=["beside mains", "quiet"])
def test_ground_has_no_running_mode(parts: tuple[str, ...]) -> None:
    samples, rate_hz = seismic_traces(*parts)[0]
    assert estimate_running_modes(samples, rate_hz, low_hz=2.0, high_hz=80.0).modes == ()


def test_mains_in_the_ground_are_a_machine_line() -> None:
    samples, rate_hz = seismic_traces(*STATION)[0]
    found = estimate_running_modes(samples, rate_hz, low_hz=2.0, high_hz=80.0)
    assert any(abs(tone.frequency_hz - 50.0) < 0.3 for tone in found.tones)
