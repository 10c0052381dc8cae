"""What a hammer channel adds to a tap recording: judged blows, response, effective masses."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from fieldkit.errors import InputError
from fieldkit.job.document import HammerEntry, RecordingEntry
from fieldkit.progress import Progress
from fieldkit.workup import (
    ResponseReading,
    TapReading,
    evidence_from,
    read_tap,
    response_notes,
    response_reading,
)
from tests.signal.made_blows import HalfSine, accelerance
from tests.workup.struck_pipe import BLOWS, HAMMER, MODES, RATE_HZ, SENSOR, entry, write


@pytest.fixture(scope="module")
def clean(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Three clean blows."""
    return write(tmp_path_factory.mktemp("struck") / "tap.wav")


@pytest.fixture(scope="module")
def reading(clean: Path) -> TapReading:
    return read_tap(entry(clean))


def answered(reading: TapReading, up_to_hz: float = 200.0) -> ResponseReading:
    found = response_reading(reading, evidence_from([reading], None, Progress()), up_to_hz)
    assert found is not None
    return found


def told(found: ResponseReading, up_to_hz: float = 200.0) -> str:
    return "\n".join(response_notes(found, up_to_hz))


@pytest.fixture(scope="module")
def found(reading: TapReading) -> ResponseReading:
    return answered(reading)


def test_effective_masses_are_those_of_the_modes(found: ResponseReading) -> None:
    """40 and 25 kg, from poles that the taps gave and forces that were measured."""
    assert found.point == "driving"
    assert [mass.kg for mass in found.masses if mass] == pytest.approx([40, 25], rel=5e-3)
    for mass in found.masses:
        assert mass is not None
        assert 0 < mass.sd_kg < 0.02 * mass.kg
    assert response_notes(found, 200.0) == ()


def test_curve_and_fit_are_the_accelerance_of_the_pipe(found: ResponseReading) -> None:
    assert found.response is not None
    assert found.fitted is not None
    assert (found.response.quantity, found.response.unit) == ("accelerance", "(m/s^2)/N")
    assert found.response.blows == 3
    at = found.response.frequency_hz
    near = (at > 12) & (at < 120)
    exact = accelerance(MODES, at)
    assert np.median(np.abs(found.response.h1 / exact - 1)[near]) < 0.02
    assert np.median(np.abs(found.fitted.at(at) / exact - 1)[near]) < 0.02
    assert all(mode.coherence > 0.999 for mode in found.fitted.modes)


def test_the_force_is_usable_as_far_as_a_half_sine_is(found: ResponseReading) -> None:
    """First root of |cos(pi x) / (1 - 4 x^2)| = 0.1: f T = 1.303, T = 4 ms."""
    assert found.usable_to_hz == pytest.approx(1.303 / 0.004, rel=0.03)


def test_the_free_decay_starts_where_the_force_ends(reading: TapReading) -> None:
    for tap, blow in zip(reading.search.taps, BLOWS, strict=True):
        assert tap.usable
        assert 0 <= tap.start - (blow.at_s + blow.contact_s) * RATE_HZ < 6


def test_without_a_hammer_nothing_changes(clean: Path) -> None:
    plain = read_tap(replace(entry(clean), hammer=None))
    assert plain.hammer is None
    assert response_reading(plain, evidence_from([plain], None, Progress()), 200.0) is None


def test_a_double_hit_that_only_the_force_shows_is_refused(tmp_path: Path) -> None:
    """The sensor sees the second hit as no more than a little noise."""
    faint = HalfSine(BLOWS[1].at_s + 0.0126, 0.12 * BLOWS[1].peak_n, 0.006)
    path = write(tmp_path / "tap.wav", (*BLOWS, faint))
    unaware = read_tap(replace(entry(path), hammer=None))
    assert all(tap.usable for tap in unaware.search.taps)
    aware = read_tap(entry(path))
    assert [tap.usable for tap in aware.search.taps] == [True, False, True]
    (reason,) = aware.search.taps[1].reasons
    assert reason.startswith("struck twice: the hammer shows another hit 13")
    assert "12 % as hard, so its force has dips at 3" in reason
    assert len(aware.records) == 2
    assert answered(aware).response.blows == 2


def test_a_double_hit_is_told_once(tmp_path: Path) -> None:
    """Where the sensor shows it too, the force says it better."""
    path = write(tmp_path / "tap.wav", (*BLOWS, HalfSine(BLOWS[1].at_s + 0.04, 40.0)))
    reasons = read_tap(entry(path)).search.taps[1].reasons
    (reason,) = [reason for reason in reasons if "struck twice" in reason]
    assert "another hit 40 ms after the first, 50 % as hard" in reason
    assert "its force has dips at 12.5, 37." in reason
    assert reason.endswith("let the hammer rebound freely, or use a lighter one")


def test_one_blow_needs_a_second(tmp_path: Path) -> None:
    found = answered(read_tap(entry(write(tmp_path / "tap.wav", BLOWS[:1]))))
    assert found.response is not None
    assert found.response.coherence is None
    assert "coherence needs two or more" in told(found)
    assert [mass.kg for mass in found.masses if mass] == pytest.approx([40, 25], rel=0.02)


def test_clipped_forces_are_left_out_of_the_response_only(tmp_path: Path) -> None:
    """The decay after a blow whose force clipped is as good as any."""
    path = write(tmp_path / "tap.wav", force_rail=70 / HAMMER)
    reading = read_tap(entry(path))
    assert len(reading.records) == 3
    found = answered(reading)
    assert found.response is not None
    assert found.response.blows == 1
    assert "each of 2 usable blows has its force clipped" in told(found)
    silent = read_tap(entry(write(path, force_rail=30 / HAMMER)))
    assert "the force of every usable blow is clipped" in told(answered(silent))


def test_a_silent_hammer_channel_is_told(tmp_path: Path) -> None:
    """The cable is off: modes as ever, no response."""
    reading = read_tap(entry(write(tmp_path / "tap.wav", force_sign=0.0)))
    assert len(reading.records) == 3
    found = answered(reading)
    assert found.response is None
    assert told(found).startswith("no frequency response: channel 2 shows no force at the blows")


def test_a_channel_that_is_not_there_is_bad_input(clean: Path) -> None:
    with pytest.raises(InputError) as caught:
        read_tap(entry(clean, hammer=HammerEntry(3)))
    assert str(caught.value).startswith(
        f"{clean}: its hammer is said to be on channel 3: there is no channel 3: "
        "the recording has channels 1 to 2"
    )


@pytest.mark.parametrize(
    ("changes", "sentence"),
    [
        ({"hammer": HammerEntry(2, HAMMER)}, "need the stations of sensor and hammer"),
        ({"at_m": None}, "need the stations of sensor and hammer"),
        ({"hammer": HammerEntry(2, HAMMER, 0.4)}, "need a blow beside the sensor"),
        ({"hammer": HammerEntry(2, None, 1.9)}, "need the sensitivity of both"),
        ({"scale": None}, "need the sensitivity of both"),
    ],
)
def test_masses_that_cannot_be_told_say_why(
    clean: Path, changes: dict[str, object], sentence: str
) -> None:
    found = answered(read_tap(entry(clean, **changes)))
    assert found.fitted is not None
    assert found.masses == (None, None)
    assert f"effective masses {sentence}" in told(found)


def test_a_sensor_mounted_the_other_way_round_is_told(tmp_path: Path) -> None:
    found = answered(read_tap(entry(write(tmp_path / "tap.wav", force_sign=-1.0))))
    assert found.wired_round
    assert "mounted or wired the other way round" in told(found)
    assert [mass.kg for mass in found.masses if mass] == pytest.approx([40, 25], rel=5e-3)


def test_reach_of_the_force_against_the_question(found: ResponseReading) -> None:
    """4 ms of contact reach to some 330 Hz."""
    assert "short of the 800 Hz looked at; use a harder tip" in told(found, 800.0)
    assert "a softer tip puts more of it where the modes are" in told(found, 20.0)


def test_a_decay_cut_short_is_told(tmp_path: Path) -> None:
    """Blows 1.6 s apart: 2.2 time constants of 18.3 Hz, exp(-2.2) = 0.11; six take 4.35 s."""
    quick = [replace(blow, at_s=2.0 + 1.6 * i) for i, blow in enumerate(BLOWS)]
    found = answered(read_tap(entry(write(tmp_path / "tap.wav", quick))))
    assert "too short for 18.3 Hz: the curve is up to 11 % too low there" in told(found)
    assert "let each blow ring for 4.4 s" in told(found)


def test_what_the_noise_hides_of_a_decay_is_kept(tmp_path: Path) -> None:
    """Heard for half of its six time constants, followed for all of them."""
    found = answered(read_tap(entry(write(tmp_path / "tap.wav", noise_m_per_s2=0.1))))
    assert found.response is not None
    assert min(found.response.rings_s) > 4.35
    assert "too short" not in told(found)


def test_noise_shows_in_the_coherence(tmp_path: Path) -> None:
    """A mode that hardly rings above the noise is doubted by name."""
    faint = (MODES[0], replace(MODES[1], constant=2e-5))
    reading = read_tap(entry(write(tmp_path / "tap.wav", modes=faint, noise_m_per_s2=0.3)))
    evidence = evidence_from([read_tap(entry(write(tmp_path / "b.wav")))], None, Progress())
    found = response_reading(reading, evidence, 200.0)
    assert found is not None
    assert "at 55 Hz: noise, or blows that differ" in told(found)
    assert "too little moves at this point to tell a mass: 55 Hz" in told(found)


def test_a_slow_rate_is_told(tmp_path: Path) -> None:
    """A hard tip lasts one or two samples of it."""
    hard = [replace(blow, contact_s=0.0012) for blow in BLOWS]
    found = answered(read_tap(entry(write(tmp_path / "tap.wav", hard))))
    assert "samples only, too few to read the force well" in told(found)


def test_only_modes_of_its_own_taps_are_fitted(reading: TapReading) -> None:
    """Not what was typed in, heard while running, or tapped elsewhere."""
    evidence = evidence_from([reading], None, Progress())
    strangers = [
        replace(evidence.modes[0], frequency_hz=30.0, **changes)
        for changes in (
            {"source": "typed"}, {"source": "running"}, {"direction": "lateral"}, {"at_m": 0.5},
        )
    ]  # fmt: skip
    more = replace(evidence, modes=(*evidence.modes, *strangers))
    found = response_reading(reading, more, 200.0)
    assert found is not None
    assert found.fitted is not None
    assert [round(mode.frequency_hz, 1) for mode in found.fitted.modes] == [18.3, 55.0]


def test_another_quantity_gives_the_same_masses(clean: Path) -> None:
    """What is said of the sensor decides the response's name and unit."""
    spoken = entry(clean, quantity="velocity", scale=SENSOR)
    assert isinstance(spoken, RecordingEntry)
    found = answered(read_tap(spoken))
    assert found.response is not None
    assert (found.response.quantity, found.response.unit) == ("mobility", "(m/s)/N")
