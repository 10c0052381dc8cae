"""Several sensors, and a hammer with a load cell: one verdict over all of them."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.capture.enough import best_here
from fieldkit.capture.force import read_force
from fieldkit.capture.joint import read_joint
from fieldkit.capture.places import Ear, Place, together
from fieldkit.capture.practice import PracticeSensor, PracticeSource, Surroundings
from fieldkit.capture.verdict import CLIPPED, DOUBLE, NO_FORCE, USABLE, WEAK
from fieldkit.signal.modes import MeasuredMode
from tests.capture.practice_rig import RATE_HZ, Rig, plant

UPRIGHT, SIDEWAYS, ALONG = (Place(way, 1.0) for way in ("vertical", "lateral", "axial"))
EARS = (Ear(0, UPRIGHT), Ear(1, SIDEWAYS), Ear(2, ALONG))
BLOW = 2 * RATE_HZ
TIME_S = np.arange(6 * RATE_HZ) / RATE_HZ - 2.0


def ringing(hz: float, size: float, seed: int) -> np.ndarray:
    """Noise, and from two seconds on a free decay that begins with a step."""
    decay = np.exp(-3 * np.maximum(TIME_S, 0)) * np.cos(2 * np.pi * hz * TIME_S) * (TIME_S >= 0)
    return size * decay + 1e-3 * np.random.default_rng(seed).standard_normal(len(TIME_S))


def contact(*at_s: float, size: float = 0.3, noise: float = 1e-4) -> np.ndarray:
    """A force of 3 ms at each of some times after the blow."""
    force = noise * np.random.default_rng(9).standard_normal(len(TIME_S))
    for number, start_s in enumerate(at_s):
        phase = (TIME_S - start_s) / 3e-3
        inside = (phase > 0) & (phase < 1)
        force += np.where(inside, size / (1 + number) * np.sin(np.pi * phase), 0.0)
    return force


def record(*sizes: float) -> np.ndarray:
    return np.stack([ringing(20.0 + 9 * i, size, i) for i, size in enumerate(sizes)], axis=1)


def test_a_sensor_that_hardly_hears_the_blow_spoils_nothing() -> None:
    """Struck upright: the channel along the pipe only has noise, and says nothing."""
    found = read_joint(record(0.3, 0.2, 0.0), RATE_HZ, BLOW, EARS)
    assert found.verdict.kind == USABLE
    assert found.rang == (UPRIGHT, SIDEWAYS)
    assert [bool(found.at(place)) for place in (UPRIGHT, SIDEWAYS, ALONG)] == [True, True, False]


def test_a_blow_is_weak_only_where_no_channel_rings() -> None:
    found = read_joint(record(0.004, 0.003, 0.0), RATE_HZ, BLOW, EARS)
    assert found.verdict.kind == WEAK
    assert all(reading.record is None for reading in found.readings)


def test_clipped_in_any_channel_is_clipped_and_the_channel_is_named() -> None:
    """Also where the others are good."""
    samples = np.clip(record(0.3, 2.5, 0.1), -1.0, 1.0)
    found = read_joint(samples, RATE_HZ, BLOW, EARS)
    assert found.verdict.kind == CLIPPED
    assert found.verdict.what.startswith("channel 2 (lateral): ")


def test_loudness_is_compared_in_the_sensors_own_unit() -> None:
    """A tenth as sensitive and half as loud: it moved five times as much."""
    ears = (Ear(0, UPRIGHT, 1.0), Ear(1, SIDEWAYS, 10.0))
    found = read_joint(record(0.3, 0.15), RATE_HZ, BLOW, ears)
    assert (found.lead, found.rang) == (1, (SIDEWAYS,))


@pytest.mark.parametrize(
    ("force", "kind", "what"),
    [
        (contact(0.0), USABLE, ""),
        (contact(0.0, 0.05), DOUBLE, "the hammer hit again 50 ms later, 50 % as hard"),
        (np.clip(contact(0.0, size=2.0), -1, 1), CLIPPED, "the hammer's channel stood at full"),
        (contact(), NO_FORCE, "the hammer's channel shows no force"),
    ],
)
def test_the_hammer_is_judged_at_once(force: np.ndarray, kind: str, what: str) -> None:
    """A second hit that no sensor tells from ringing, a force at its limit, no force at all."""
    samples = np.column_stack([record(0.3), force])
    found = read_joint(samples, RATE_HZ, BLOW, EARS[:1], hammer=1)
    assert found.verdict.kind == kind
    assert found.verdict.what.startswith(what)
    assert len(found.struck) == (kind == USABLE)


def test_a_force_that_does_not_reach_is_remarked() -> None:
    """A half sine of 3 ms has its first zero at 500 Hz, and has fallen 20 dB well below that.

    The spectrum of a half sine of length T is proportional to cos(pi f T) / (1 - (2 f T)^2), which
    is a tenth at f T = 1.303 (solved by hand from the formula).
    """
    reading = read_force(contact(0.0), RATE_HZ, BLOW)
    assert reading.reaches_hz == pytest.approx(1.303 / 3e-3, rel=0.02)
    assert reading.remark(200.0) == ""
    assert "use a harder tip" in reading.remark(1000.0)


def triaxial(*, hammer: bool = False) -> Rig:
    """Three sensors at one place."""
    sensors = [PracticeSensor(1.0, way) for way in ("vertical", "lateral", "axial")]
    if hammer:
        sensors.append(PracticeSensor(1.0, "vertical", 1e4, hammer=True))
    around = Surroundings(noise=4e-3)
    return Rig(PracticeSource(plant(), sensors, rate_hz=RATE_HZ, surroundings=around))


def test_a_triaxial_sensor_is_struck_both_ways_and_never_turned() -> None:
    """Upright modes from upright blows, sideways ones from sideways blows, each with its direction;
    the axial channel, which hears nothing, asks for nothing."""
    rig = triaxial()
    first = rig.struck(direction="vertical")
    assert first.latest is not None
    assert first.latest.verdict.usable
    assert first.advice.startswith("strike vertical: 2 more good blows")
    rig.struck(direction="vertical")
    upright = rig.struck(direction="vertical")
    assert upright.advice.startswith("strike lateral: 3 good blows wanted")
    assert (upright.wanted.direction, upright.worth.more) == ("lateral", 3)
    for _ in range(3):
        sideways = rig.struck(direction="lateral")
    assert sideways.worth.more == 0
    assert sideways.advice.startswith("this place has told what it can")
    assert sideways.estimate is not None
    found = [(m.direction, round(m.frequency_hz, 1)) for m in sideways.estimate.modes]
    assert found == [
        ("lateral", 19.2), ("vertical", 24.0), ("lateral", 48.8), ("vertical", 61.0),
    ]  # fmt: skip
    rig.test.stop()


def test_the_response_shows_its_coherence_from_the_second_blow_on() -> None:
    """Nearly 1 at the modes of a rig that is linear."""
    rig = triaxial(hammer=True)
    one = rig.struck(direction="vertical")
    assert one.latest is not None
    assert one.latest.verdict.usable
    assert one.response is None
    two = rig.struck(direction="vertical")
    assert two.response is not None
    assert two.response.blows == 2
    near = {round(hz): value for hz, value in two.response.coherence}
    assert {24, 61} <= near.keys()
    assert near[24] > 0.99
    assert two.response.reaches_hz == pytest.approx(1.303 / 3e-3, rel=0.05)
    double = rig.struck(direction="vertical", fault="double")
    assert double.latest is not None
    assert double.latest.verdict.kind == DOUBLE
    rig.test.stop()


def mode(hz: float, sd_hz: float, direction: str) -> MeasuredMode:
    return MeasuredMode(hz, sd_hz, 0.01, 0.001, direction, taps=3)


def test_a_mode_that_another_direction_knows_better_asks_for_no_blow_here() -> None:
    """What leaks into a sensor across is no reason to go on; another mode nearby is."""
    mine = (mode(24.1, 0.3, "lateral"), mode(30.0, 0.2, "lateral"))
    others = [(mode(24.0, 0.01, "vertical"), mode(32.0, 0.01, "vertical"))]
    assert best_here(mine, others) == mine[1:]


def test_places_are_named_in_a_few_words() -> None:
    """The station once where all share it."""
    assert together([UPRIGHT]) == "vertical at 1.00 m"
    assert together([UPRIGHT, SIDEWAYS]) == "vertical, lateral at 1.00 m"
    assert together([UPRIGHT, Place("lateral", 2.0)]) == "vertical at 1.00 m, lateral at 2.00 m"
