"""The recordings hold what the simulation put in, and ``fieldkit peaks`` gets it out again."""

from __future__ import annotations

import json
from functools import cache
from typing import Any

import make
import numpy as np
import pytest
import soundfile
from plants import PLANTS, SMALL_BORE, TapSession
from sound import tap_signal

from tests.cli.running import fieldkit
from tests.samples import JOBS, SAMPLES

SESSIONS = [(plant.folder, session) for plant in PLANTS for session in plant.taps]
EACH_SESSION = pytest.mark.parametrize(
    ("folder", "session"), SESSIONS, ids=[f"{folder}/{s.file}" for folder, s in SESSIONS]
)
PLAIN_DB = 45.0
"""Decay energy over the noise above which nobody may overlook a mode."""
FALSE_ALARM_SD = 4.0
"""Standard deviations: one estimate in 16,000 is further off by chance."""
MASKED_DB = 30.0
"""Decay energy below the strongest mode's at which one may hide in its foot."""


@cache
def peaks(folder: str, file: str) -> dict[str, Any]:
    ran = fieldkit("peaks", SAMPLES / folder / file, "--json")
    assert ran.status == 0, ran.err
    return ran.document


@cache
def truth_of(folder: str, file: str) -> dict[str, Any]:
    truth = json.loads((SAMPLES / folder / "truth.json").read_text(encoding="utf-8"))
    return next(tap for tap in truth["taps"] if tap["file"] == file)


def test_samples_stay_small() -> None:
    """They travel in every wheel: each a few hundred kB, all together below 3 MB."""
    sizes = [path.stat().st_size for path in SAMPLES.rglob("*.flac")]
    assert max(sizes) < 500_000
    assert sum(sizes) < 3_000_000


@EACH_SESSION
def test_a_recording_is_quiet_before_its_first_blow_and_clips_in_one_only(
    folder: str, session: TapSession
) -> None:
    samples, rate = soundfile.read(SAMPLES / folder / session.file)
    assert rate == session.rate_hz
    before = samples[: int((session.hits[0].at_s - 0.05) * rate)]
    assert len(before) >= 1.5 * rate
    assert np.max(np.abs(before)) < 0.03
    railed = np.flatnonzero(np.abs(samples) > 0.9999) / rate
    assert len(railed) > 1
    assert np.all(np.abs(railed - session.hits[3].at_s) < 0.2)


@EACH_SESSION
def test_four_good_taps_are_used_and_the_bad_two_turned_away_with_reasons(
    folder: str, session: TapSession
) -> None:
    (recording,) = peaks(folder, session.file)["recordings"]
    taps = recording["taps"]
    struck = [hit.at_s for hit in session.hits]
    assert [tap["at_s"] for tap in taps] == pytest.approx(struck, abs=0.01)
    assert [tap["usable"] for tap in taps] == [True, True, False, False, True, True]
    assert "twice" in " ".join(taps[2]["reasons"])
    assert "clipped" in " ".join(taps[3]["reasons"])


@EACH_SESSION
def test_peaks_finds_every_plain_mode_within_its_stated_uncertainty(
    folder: str, session: TapSession
) -> None:
    found = peaks(folder, session.file)["modes"]
    highest = max(mode["frequency_hz"] for mode in found)
    strongest = max(m["energy_db"] for m in truth_of(folder, session.file)["modes"])
    for mode in truth_of(folder, session.file)["modes"]:
        plain = mode["energy_db"] > max(PLAIN_DB, strongest - MASKED_DB)
        if mode["leaked"] or not plain or mode["frequency_hz"] > highest:
            continue
        nearest = min(found, key=lambda f: abs(f["frequency_hz"] - mode["frequency_hz"]))
        for value, doubt in (("frequency_hz", "frequency_sd_hz"), ("damping_ratio", "damping_sd")):
            error = abs(nearest[value] - mode[value])
            assert error < FALSE_ALARM_SD * nearest[doubt], (mode, nearest)
        assert nearest["frequency_sd_hz"] < 2e-3 * mode["frequency_hz"]


@EACH_SESSION
def test_peaks_claims_no_mode_that_is_not_there(folder: str, session: TapSession) -> None:
    """Weak ones of the other plane may show; each is a true mode of the pipe all the same."""
    truth = json.loads((SAMPLES / folder / "truth.json").read_text(encoding="utf-8"))
    true = np.array([mode["frequency_hz"] for mode in truth["states"]["tapped"]["modes"]])
    for mode in peaks(folder, session.file)["modes"]:
        error = np.min(np.abs(true - mode["frequency_hz"]))
        assert error < FALSE_ALARM_SD * mode["frequency_sd_hz"], mode


@EACH_SESSION
def test_mains_hum_is_called_a_tone(folder: str, session: TapSession) -> None:
    tones = [tone["frequency_hz"] for tone in peaks(folder, session.file)["tones"]]
    assert tones == pytest.approx(sorted(session.hum), abs=0.1)


@pytest.mark.parametrize("folder", JOBS)
def test_the_running_recording_shows_the_orders_of_the_machine(folder: str) -> None:
    """The strongest lines of either channel are orders of the true speed, within 0.2 %."""
    plant = next(p for p in PLANTS if p.folder == folder)
    path = SAMPLES / folder / plant.run.file
    samples, rate = soundfile.read(path)
    assert samples.shape == (int(plant.run.length_s * rate), 2)
    assert np.max(np.abs(samples)) < 0.9
    windowed = samples * np.hanning(len(samples))[:, None]
    spectrum = np.max(np.abs(np.fft.rfft(windowed, axis=0)), axis=1)
    frequency = np.fft.rfftfreq(len(samples), 1 / rate)
    orders = plant.machine.rpm / 60 * np.array(list(plant.machine.force_n))
    strongest = frequency[np.argmax(spectrum * (frequency > 5))]
    assert np.min(np.abs(strongest / orders - 1)) < 2e-3


def test_the_script_makes_the_recordings_that_are_shipped() -> None:
    """Same seeds, same samples: to one step of the converter, on any machine."""
    session = SMALL_BORE.taps[0]
    modes = make.modes_in(SMALL_BORE, SMALL_BORE.tapped)
    damping = make.damping_of(SMALL_BORE, SMALL_BORE.tapped, len(modes.frequency_hz))
    made = tap_signal(modes, damping, session) / session.full_scale
    shipped, _ = soundfile.read(SAMPLES / SMALL_BORE.folder / session.file)
    assert np.clip(made, -1, 1) == pytest.approx(shipped, abs=1.6 * 2 ** (1 - session.bits))
