"""The practice rig: through session, disk and guide to modes, and on to the job's own answers."""

from __future__ import annotations

import threading
from dataclasses import replace

import numpy as np
import pytest

from fieldkit.capture.calibration import calibrate
from fieldkit.capture.guided_test import GuidedTest
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.practice import PracticeSensor, PracticeSource, Surroundings
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import RecordingInfo, read_info
from fieldkit.capture.snapshot import ENDED, RUNNING, WAITING
from fieldkit.capture.source import Block
from fieldkit.capture.writer import RecordingWriter
from fieldkit.cli.samples import sample_jobs
from fieldkit.detune.excitation import bands
from fieldkit.errors import InputError
from fieldkit.job.document import HammerEntry
from fieldkit.job.schema import load_job
from fieldkit.progress import Progress
from fieldkit.workup import entry_for, evidence_from, read_tap, response_reading
from fieldkit.workup.expected import expected_modes
from fieldkit.workup.practice import practice_channels, practice_plant, practice_source
from tests.capture.practice_rig import RATE_HZ, plant
from tests.capture.rig import until

SETUP = ChannelSetup(sensitivity="100 mV/g", full_scale="0.7 V", direction="vertical", at="1.95 m")


class Hurry:
    """Lets time pass as fast as a session takes the frames, up to a second ahead of it."""

    def __init__(self, rate_hz: int) -> None:
        self.taken = lambda: 0
        self._rate_hz = rate_hz
        self._at_s = 0.0

    def now_s(self) -> float:
        return self._at_s

    def wait(self, seconds: float, stop: threading.Event) -> None:
        self._at_s += max(seconds, 0.0)
        while self._at_s - self.taken() / self._rate_hz > 1.0 and not stop.is_set():
            stop.wait(0.001)


class Striker:
    """A listener that strikes when the test is armed and has been quiet for a while."""

    def __init__(self, source: PracticeSource, test: GuidedTest, blows: int) -> None:
        self.source, self.test, self.left = source, test, blows
        self._armed = 0

    def feed(self, block: Block) -> None:
        armed = self.test.snapshot().phase == "armed"
        self._armed = self._armed + len(block.samples) if armed else 0
        if self._armed > 2.5 * self.source.rate_hz and self.left:
            self.source.tap()
            self.left -= 1
            self._armed = 0


def test_from_the_rig_through_session_disk_and_guide_to_its_modes(tmp_path) -> None:
    """A sample job's own span: live and from the file the same modes, within what they state."""
    job = load_job(sample_jobs()[0])
    pace = Hurry(RATE_HZ)
    source = practice_source(job, [SETUP], rate_hz=RATE_HZ, pace=pace)
    session = Session(source)
    pace.taken = lambda: session.snapshot().frames
    test = GuidedTest(
        rate_hz=RATE_HZ, ears=[Ear(0, Place("vertical", 1.95))], up_to_hz=job.goal.up_to_hz
    )
    session.record(tmp_path / "tap-1.wav", [SETUP])
    session.add(test)
    session.add(Striker(source, test, 3))
    session.start()
    until(lambda: len(test.snapshot().blows) == 3 and not test.snapshot().estimating, 120.0)
    session.stop()
    assert session.join(60.0)
    test.stop()
    shot, told = test.snapshot(), session.snapshot()
    assert [blow.verdict.kind for blow in shot.blows] == ["usable"] * 3
    assert (told.simulated, told.gaps) == (True, 0)
    assert shot.estimate is not None

    reading = read_tap(entry_for(tmp_path / "tap-1.wav", "tap"))
    assert reading.notes == ("simulated by the practice rig: nothing was measured",)
    read = evidence_from([reading], None, Progress(), job.goal.up_to_hz)
    truth = source.plant.frequency_hz
    for modes in (shot.estimate.modes, read.modes):
        assert len(modes) >= 1
        for mode in modes:
            off = np.abs(truth - mode.frequency_hz).min()
            assert off < 4 * mode.frequency_sd_hz + 1e-5 * mode.frequency_hz
    seen = source.plant.seen(1.95, source.struck_m, "vertical", 0.1)
    found = [m.frequency_hz for m in shot.estimate.modes]
    for hz in seen[seen < job.goal.up_to_hz]:
        assert min(abs(hz - f) for f in found) < 0.1


def test_the_plant_of_a_job_is_near_it_and_always_the_same() -> None:
    """It lies about where the job expects it, not quite there, and runs into an excitation."""
    job = load_job(sample_jobs()[0])
    one, again = practice_plant(job), practice_plant(job)
    np.testing.assert_array_equal(one.frequency_hz, again.frequency_hz)
    other = practice_plant(job, seed=5)
    assert one.frequency_hz[0] != other.frequency_hz[0]
    assert one.machine is not None
    assert one.machine.speed_rpm == pytest.approx(1472.5)
    running = practice_plant(job, running=True)
    near = bands(job.excitations, 0.1)
    assert any(band.holds(hz) for band in near for hz in running.frequency_hz)
    assert running.frequency_hz[0] < one.frequency_hz[0]


def test_a_pure_mode_of_the_rig_decays_as_stated() -> None:
    """After a blow the level falls by exp(-zeta omega t), without an error of time stepping."""
    alone = replace(plant(20.0), frequency_hz=np.array([20.0, 900.0]))
    silence = Surroundings(noise=0.0, hum=0.0)
    quiet = PracticeSource(
        alone, [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ, surroundings=silence
    )
    quiet.tap()
    samples = np.concatenate([quiet.block(0).samples[:, 0] for _ in range(100)])
    period = RATE_HZ // 20
    cycles = samples[period : period * 39].reshape(-1, period)
    rms = np.sqrt((cycles.astype(float) ** 2).mean(axis=1))
    decay = 2 * np.pi * 20.0 * 0.012 / 20
    np.testing.assert_allclose(np.diff(np.log(rms)), -decay, atol=2e-3)


def test_usual_blows_use_the_input_well_and_differ_like_those_of_a_hand() -> None:
    """About a third of full scale, none alike."""
    rig = PracticeSource(plant(), [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ)
    peaks = []
    for _ in range(6):
        rig.tap()
        peaks.append(max(np.abs(rig.block(0).samples).max() for _ in range(200)))
    assert 0.15 < min(peaks) < max(peaks) < 0.6
    assert len({round(float(p), 6) for p in peaks}) == 6


def test_a_gap_that_was_asked_for_is_told_with_its_cause() -> None:
    """A tenth of a second, four tenths after the blow."""
    rig = PracticeSource(plant(), [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ)
    rig.tap(fault="gap")
    lost = [b for b in (rig.block(i) for i in range(50)) if b.lost_frames]
    assert [b.lost_frames for b in lost] == [RATE_HZ // 10]
    assert "as asked" in lost[0].cause


def test_what_it_cannot_do_is_refused() -> None:
    """An unknown fault, a machine it has not, another number of sensors."""
    rig = PracticeSource(replace(plant(), machine=None), [PracticeSensor(1.0, "vertical")])
    with pytest.raises(InputError, match="fault"):
        rig.tap(fault="thunder")
    with pytest.raises(InputError, match="no machine"):
        rig.machine(on=True)
    with pytest.raises(InputError, match="2 sensor"):
        rig.move([PracticeSensor(1.0, "vertical")] * 2)


def test_unplugged_it_is_away_and_comes_back() -> None:
    """As a device that vanishes: the session waits, and goes on by itself."""
    pace = Hurry(RATE_HZ)
    rig = PracticeSource(plant(), [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ, pace=pace)
    session = Session(rig, retry_every_s=0.0)
    pace.taken = lambda: session.snapshot().frames
    states = []
    session.start()
    until(lambda: session.snapshot().state == RUNNING)
    rig.unplug()
    until(lambda: states.append(session.snapshot()) or session.snapshot().gaps == 1)
    assert any(s.state == WAITING or s.gaps for s in states)
    session.stop()
    assert session.join(60.0)
    assert session.snapshot().state == ENDED


def test_the_sidecar_says_simulated(tmp_path) -> None:
    """Wherever the samples go."""
    pace = Hurry(RATE_HZ)
    rig = PracticeSource(plant(), [PracticeSensor(1.0, "vertical")], rate_hz=RATE_HZ, pace=pace)
    session = Session(rig)
    pace.taken = lambda: session.snapshot().frames
    session.start()
    session.record(tmp_path / "x.wav", [SETUP], seconds=1.0)
    until(lambda: (r := session.snapshot().recording) is not None and r.done)
    session.stop()
    assert session.join(60.0)
    info = read_info(tmp_path / "x.wav")
    assert info is not None
    assert (info.simulated, info.device) == (True, "the practice rig")


@pytest.mark.parametrize(
    ("written", "found"),
    [
        (SETUP, "103 mV/g"),
        (replace(SETUP, sensitivity="98 mV/g"), "103 mV/g"),
        (replace(SETUP, sensitivity="10 mV/g", full_scale="1.4 V"), "10.3 mV/g"),
        (replace(SETUP, sensitivity=None, full_scale=None, scale="20 m/s^2"), None),
    ],
)
def test_a_calibration_of_the_rig_finds_what_its_sensor_has_and_finds_it_again(
    written: ChannelSetup, found: str | None
) -> None:
    """3 % more than the round figure on the sensor, to 0.1 %; calibrated again, the same."""
    job = load_job(sample_jobs()[0])
    setup = written
    for _ in range(3):
        rig = practice_source(job, [setup])
        rig.shake(10.0)
        samples = np.concatenate([rig.block(0).samples[:, 0] for _ in range(200)])
        calibration = calibrate(samples, rig.rate_hz, reference_rms=10.0)
        assert calibration.si_per_unit == pytest.approx(rig.sensors[0].full_scale, rel=1e-3)
        setup = calibration.setup(setup)
        assert setup.si_per_unit == pytest.approx(rig.sensors[0].full_scale, rel=1e-3)
        if found is not None:
            assert setup.sensitivity == found


def test_what_nobody_said_of_a_channel_is_filled_in() -> None:
    """Two channels stand upright and sideways at one place, calibrated."""
    job = load_job(sample_jobs()[0])
    one, two = practice_channels(job, [ChannelSetup(), ChannelSetup(at="1 m")])
    assert (one.direction, two.direction, one.at, two.at) == (
        "vertical",
        "lateral",
        "1 m",
        "1 m",
    )
    assert one.si_per_unit == pytest.approx(68.6, rel=1e-3)
    with pytest.raises(InputError, match="pressure"):
        practice_channels(job, [ChannelSetup("pressure")])


def test_the_model_tells_which_modes_a_direction_shows() -> None:
    """Upright modes are expected upright only, and move most where the model says."""
    job = load_job(sample_jobs()[0])
    upright, sideways = (expected_modes(job, way) for way in ("vertical", "lateral"))
    assert upright
    assert sideways
    assert not {m.frequency_hz for m in upright} & {m.frequency_hz for m in sideways}
    assert all(mode.motion.max() == 1.0 for mode in (*upright, *sideways))
    assert expected_modes(job, None) == ()


def test_the_hammer_of_the_rig_weighs_its_modes(tmp_path) -> None:
    """Struck at the sensor, the effective mass is one over the square of the mass-normalised shape,
    and 3 % too low with a sensor that reads 3 % high."""
    job = load_job(sample_jobs()[0])
    setups = practice_channels(job, [ChannelSetup(direction="lateral"), ChannelSetup("force")])
    rig = practice_source(job, setups, rate_hz=RATE_HZ)
    path = tmp_path / "tap-1.wav"
    info = RecordingInfo(rig.name, RATE_HZ, setups, "2026-01-01T00:00:00+00:00", simulated=True)
    writer = RecordingWriter(path, info)
    for number in range(900):
        if number % 250 == 150:
            rig.tap()
        writer.feed(rig.block(number * 80))
    writer.close("done")
    hammer = HammerEntry(2, setups[1].si_per_unit, setups[1].at_m)
    reading = read_tap(replace(entry_for(path, "tap"), hammer=hammer))
    evidence = evidence_from([reading], None, Progress(), job.goal.up_to_hz)
    found = response_reading(reading, evidence, job.goal.up_to_hz)
    assert found is not None
    assert found.fitted is not None
    strongest = int(np.argmin([mass.kg if mass else np.inf for mass in found.masses]))
    mass, hz = found.masses[strongest], found.fitted.modes[strongest].frequency_hz
    nearest = int(np.argmin(np.abs(rig.plant.frequency_hz - hz)))
    at_m = setups[0].at_m
    assert at_m is not None
    truth = 1 / rig.plant.motion(at_m, "lateral")[nearest] ** 2
    assert mass is not None
    assert mass.kg == pytest.approx(truth / 1.03, rel=0.02)
