"""Ground-motion records in which nobody struck a structure: mains hum, and quiet ground.

Carried by the obspy package among its test data; how much of each is mains is read from its bare
transform here.
"""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.modes import TapRecord, estimate_modes
from fieldkit.signal.running import read_running
from fieldkit.signal.running_modes import estimate_running_modes
from fieldkit.signal.taps import cut, find_taps
from tests.published.outside import seismic_traces

pytestmark = pytest.mark.outside

EXPLORATION = ("io", "seg2", "tests", "data", "20130107_103041000.CET.3c.cont.0.seg2.gz")
"""Three-component geophone, 1 kHz, 2 s; half of the power of one component is 50 Hz."""
STATION = ("io", "mseed", "tests", "data", "timingquality.mseed")
"""Station BW.BGLD, east, 200 Hz, 208 s, with 50 Hz mains."""
QUIET = ("io", "gse2", "tests", "data", "loc_RJOB20050831023349.z")
"""Station RJOB, vertical, 200 Hz, 60 s of quiet ground."""
EARTHQUAKE = ("io", "nied", "tests", "data", "test.knet")
"""Strong-motion station AKT013, 100 Hz, 59 s of an earthquake."""
HOUR = ("signal", "tests", "data")
"""Folder of ref_STS2 and ref_unknown: two seismometers side by side, 200 Hz, one hour."""

MAINS_HZ = 50.0


def share_at_mains(samples: np.ndarray, rate_hz: float) -> float:
    """Share of the power within 1 Hz of the mains, by the transform of the centred record."""
    power = np.abs(np.fft.rfft((samples - samples.mean()) * np.hanning(len(samples)))) ** 2
    frequency_hz = np.fft.rfftfreq(len(samples), 1 / rate_hz)
    return float(power[abs(frequency_hz - MAINS_HZ) < 1].sum() / power.sum())


@pytest.fixture(scope="module", params=[0, 1, 2])
def geophone(request: pytest.FixtureRequest) -> tuple[np.ndarray, float]:
    """One component of the exploration geophone."""
    return seismic_traces(*EXPLORATION)[request.param]


def test_mains_hum_is_no_blow_and_no_mode(geophone: tuple[np.ndarray, float]) -> None:
    """No blow in it; taken for a decay all the same, it yields the mains as a tone and no mode."""
    samples, rate_hz = geophone
    assert share_at_mains(samples, rate_hz) > 0.1
    assert not find_taps(samples, rate_hz, full_scale=None).taps
    half = len(samples) // 2
    for record in (
        TapRecord(samples, rate_hz, np.zeros(0)),
        TapRecord(samples[half:], rate_hz, samples[:half]),
    ):
        estimate = estimate_modes([record], high_hz=400.0)
        assert not estimate.modes
        assert any(abs(tone.frequency_hz - MAINS_HZ) < 0.25 for tone in estimate.tones)


def test_mains_hum_is_the_strongest_running_line(geophone: tuple[np.ndarray, float]) -> None:
    samples, rate_hz = geophone
    picture = read_running(samples, rate_hz)
    assert abs(picture.lines[0].frequency_hz - MAINS_HZ) < 0.25


def test_station_beside_mains_claims_no_mode() -> None:
    """What stands out of the ground's noise as a blow over three minutes gives no mode."""
    samples, rate_hz = seismic_traces(*STATION)[0]
    assert share_at_mains(samples, rate_hz) > 0.1
    records = cut(samples, rate_hz, find_taps(samples, rate_hz, full_scale=None))
    if records:
        assert not estimate_modes(records, high_hz=80.0).modes
    lines = read_running(samples, rate_hz).lines
    steady = [line.frequency_hz for line in lines if line.steady]
    assert steady == [pytest.approx(MAINS_HZ, abs=0.25)]


@pytest.mark.parametrize(
    ("record", "mains"), [(STATION, True), (QUIET, False), (EARTHQUAKE, False)]
)
def test_ground_motion_taken_for_running_vibration_claims_no_mode(
    record: tuple[str, ...], mains: bool
) -> None:
    """Output only: neither hum, nor the ground's noise, nor an earthquake is a mode of pipework."""
    samples, rate_hz = seismic_traces(*record)[0]
    estimate = estimate_running_modes(samples, rate_hz, high_hz=0.4 * rate_hz)
    assert not estimate.modes
    assert any(abs(tone.frequency_hz - MAINS_HZ) < 0.25 for tone in estimate.tones) == mains


def test_no_blow_in_a_minute_of_quiet_ground() -> None:
    samples, rate_hz = seismic_traces(*QUIET)[0]
    assert not find_taps(samples, rate_hz, full_scale=None).taps


@pytest.mark.parametrize("name", ["ref_STS2", "ref_unknown"])
def test_an_hour_of_ground_claims_no_mode(name: str) -> None:
    """What jolts either of two seismometers side by side within an hour gives no mode."""
    samples, rate_hz = seismic_traces(*HOUR, name)[0]
    assert len(samples) / rate_hz > 3599
    records = cut(samples, rate_hz, find_taps(samples, rate_hz, full_scale=None))
    if records:
        assert not estimate_modes(records, high_hz=80.0).modes
