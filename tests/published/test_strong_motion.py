"""A strong-motion accelerogram: offset, unit and level of a record made and measured elsewhere.

K-NET station AKT013, east-west, 1996-08-11 03:12, 100 Hz, 59 s, as carried by the obspy package.
Its header states the scale (2000 gal over 8388608 counts) and the largest acceleration, 4.383 gal,
after the mean is taken off.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest

from fieldkit.signal.recording import channel_signal, load
from fieldkit.signal.running import read_running
from fieldkit.signal.spectrum import overall_rms
from tests.published.outside import seismic_file

pytestmark = pytest.mark.outside

HEADER_LINES = 17
GAL_M_PER_S2 = 0.01  # exact: 1 gal = 1 cm/s^2


@dataclass(frozen=True)
class Accelerogram:
    """A K-NET record: plain text, a header of fixed width, then counts."""

    counts: np.ndarray
    rate_hz: float
    gal_per_count: float
    maximum_gal: float

    @property
    def gal(self) -> np.ndarray:
        """With its offset, as the instrument gave it."""
        return self.counts * self.gal_per_count


@pytest.fixture(scope="module")
def record() -> Accelerogram:
    path = seismic_file("io", "nied", "tests", "data", "test.knet")
    lines = path.read_text(encoding="ascii").splitlines()
    header = {line[:18].strip(): line[18:].strip() for line in lines[:HEADER_LINES]}
    over, under = header["Scale Factor"].split("/")
    return Accelerogram(
        np.array(" ".join(lines[HEADER_LINES:]).split(), float),
        float(header["Sampling Freq(Hz)"].removesuffix("Hz")),
        float(over.removesuffix("(gal)")) / float(under),
        float(header["Max. Acc. (gal)"]),
    )


@pytest.fixture
def table(record: Accelerogram, tmp_path: Path) -> Path:
    """The same numbers as a logger would export them: seconds and gal, offset and all."""
    path = tmp_path / "east-west.csv"
    rows = [f"{i / record.rate_hz:.2f},{gal:.9f}" for i, gal in enumerate(record.gal)]
    path.write_text("\n".join(["time [s],acceleration [gal]", *rows]), encoding="ascii")
    return path


def test_header_and_counts_agree(record: Accelerogram) -> None:
    """5900 counts at 100 Hz are the 59 s stated, far from centred on zero."""
    assert len(record.counts) == 5900
    assert record.rate_hz == 100.0
    assert abs(record.gal.mean()) > 4 * record.gal.std()


def test_largest_acceleration_through_the_loader_is_the_stated_one(
    record: Accelerogram, table: Path
) -> None:
    """4.383 gal after the mean is taken off, in m/s^2, to the three decimals stated."""
    recording = load(table)
    channel = recording.channels[0]
    assert (channel.quantity, channel.scale) == ("acceleration", pytest.approx(GAL_M_PER_S2))
    assert recording.rate_hz == pytest.approx(record.rate_hz, rel=1e-9)
    acceleration = channel_signal(recording, 1) * channel.scale
    largest = np.abs(acceleration - acceleration.mean()).max()
    assert largest == pytest.approx(record.maximum_gal * GAL_M_PER_S2, abs=0.5e-3 * GAL_M_PER_S2)


def test_overall_level_is_that_of_the_samples_without_their_offset(
    record: Accelerogram, table: Path
) -> None:
    """Parseval's theorem on a real record, its offset taken off."""
    recording = load(table)
    samples = channel_signal(recording, 1)
    centred = samples - samples.mean()
    root = np.sqrt(np.mean(centred**2))
    assert overall_rms(centred, record.rate_hz, 0.0, record.rate_hz / 2) == pytest.approx(
        root, rel=1e-9
    )


def test_running_level_is_that_of_the_bare_transform_in_the_band(
    record: Accelerogram, table: Path
) -> None:
    """2 Hz to 39 Hz by summing the transform's lines; the offset of 5 times the motion is told."""
    recording = load(table)
    channel = recording.channels[0]
    samples = channel_signal(recording, 1)
    picture = read_running(
        samples, recording.rate_hz, quantity=channel.quantity, scale=channel.scale, high_hz=39.0
    )
    line = np.fft.rfft(samples - samples.mean()) / len(samples)
    frequency_hz = np.fft.rfftfreq(len(samples), 1 / record.rate_hz)
    inside = (frequency_hz >= 2.0) & (frequency_hz <= 39.0)
    expected = np.sqrt(2 * np.sum(np.abs(line[inside]) ** 2)) * GAL_M_PER_S2
    assert picture.spectrum.unit == "m/s^2"
    assert picture.overall_rms == pytest.approx(expected, rel=2e-3)
    assert any("offset" in warning for warning in picture.warnings)
