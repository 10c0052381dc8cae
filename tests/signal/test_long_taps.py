"""A tap recording searched stretch by stretch holds the blows it holds when searched whole."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import soundfile
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import Cancelled, InputError
from fieldkit.progress import Progress
from fieldkit.signal import long_taps
from fieldkit.signal.long_taps import cut_from, find_taps_in, what_was_cut
from fieldkit.signal.recording import Channel, Recording
from fieldkit.signal.source import RecordingSource, held, open_recording
from fieldkit.signal.taps import TapSearch, find_taps
from tests.signal.made_taps import Blow, Made, coloured, hum, tap_recording

RATE_HZ = 2000.0
MODES = (Made(17.3, 0.02, 1.0), Made(41.0, 0.015, 0.6, 0.8), Made(163.0, 0.01, 0.5, 2.0))


@pytest.fixture(autouse=True)
def short_stretches(monkeypatch: pytest.MonkeyPatch) -> None:
    """So that a few minutes are cut into many."""
    monkeypatch.setattr(long_taps, "STRETCH_S", 20.0)
    monkeypatch.setattr(long_taps, "LONGEST_STRETCH_S", 80.0)


def recorded(
    blows: list[Blow],
    duration_s: float,
    *,
    seed: int = 0,
    modes: tuple[Made, ...] = MODES,
    density: float = 3e-4,
) -> np.ndarray:
    clean = tap_recording(modes, blows, duration_s, RATE_HZ)
    rng = np.random.default_rng(seed)
    return clean + coloured(rng, len(clean), RATE_HZ, density, 0.0)


def source(signal: np.ndarray, full_scale: float | None = None) -> RecordingSource:
    return held(Recording(signal[:, None], RATE_HZ, (Channel("a"),), "made.wav", full_scale))


def kinds(reasons: tuple[str, ...]) -> list[str]:
    return [reason.split(":")[0] for reason in reasons]


def assert_same(
    ours: TapSearch, whole: TapSearch, *, start_s: float = 0.005, end_s: float = 0.5
) -> None:
    """Blows within two milliseconds, decays within what the level of the background leaves open."""
    assert [t.at_s for t in ours.taps] == pytest.approx([t.at_s for t in whole.taps], abs=2e-3)
    assert [t.usable for t in ours.taps] == [t.usable for t in whole.taps]
    for mine, reference in zip(ours.taps, whole.taps, strict=True):
        assert kinds(mine.reasons) == kinds(reference.reasons)
        assert mine.start == pytest.approx(reference.start, abs=start_s * RATE_HZ)
        assert mine.end == pytest.approx(reference.end, abs=end_s * RATE_HZ)
        assert mine.peak == pytest.approx(reference.peak, rel=1e-9)


def blows_of(seed: int, duration_s: float) -> list[Blow]:
    """Blows at random: some alone, some double, some before the last one has died away."""
    rng = np.random.default_rng(seed)
    blows: list[Blow] = []
    at_s = rng.uniform(2.0, 6.0)
    while at_s < duration_s - 6.0:
        blows.append(Blow(at_s, rng.uniform(0.3, 1.2), rng.uniform(0.001, 0.004)))
        if rng.random() < 0.15:
            blows.append(Blow(at_s + rng.uniform(0.04, 0.25), 0.6 * blows[-1].strength))
        at_s += rng.choice([rng.uniform(1.5, 3.0), rng.uniform(5.0, 12.0), rng.uniform(20.0, 45.0)])
    return blows


def test_three_minutes_in_stretches_of_twenty_seconds_are_as_the_whole():
    signal = recorded(blows_of(11, 180.0), 180.0, seed=1)
    signal += hum(len(signal), RATE_HZ, 50.02, [0.02, 0.005])
    whole, ours = find_taps(signal, RATE_HZ, full_scale=None), find_taps_in(source(signal))
    assert len(whole.taps) > 10
    assert {t.usable for t in whole.taps} == {True, False}
    assert_same(ours, whole)
    assert ours.background == whole.background
    assert ours.noise_rms == pytest.approx(whole.noise_rms, rel=1e-9)


@given(st.integers(0, 2**31))
@settings(max_examples=4)
def test_blows_at_random_times_are_found_where_they_were_struck(seed):
    """Each blow once, at its time, wherever the stretches end; doubles and overlaps are refused."""
    blows = blows_of(seed, 90.0)
    ours = find_taps_in(source(recorded(blows, 90.0, seed=seed % 1000)))
    firsts = [
        blow
        for before, blow in zip([None, *blows], blows, strict=False)
        if before is None or blow.at_s - before.at_s > 0.3
    ]
    found = np.array([t.at_s for t in ours.taps])
    for blow in firsts:
        assert np.sum(np.abs(found - blow.at_s) < 0.015) == 1
    assert all(a.end <= b.start for a, b in zip(ours.taps, ours.taps[1:], strict=False))


@pytest.mark.parametrize("at_s", [13.0, 16.3, 18.7, 19.6, 21.0])
def test_decay_is_never_cut_by_the_end_of_a_stretch(at_s):
    """A mode that rings for ten seconds, struck anywhere before, at and after the first end.

    It falls by 3.6 dB a second, so that its end in the noise is known to a second or so, and it is
    slow, so that the scale at which it shows first may be the next one.
    """
    slow = (Made(11.0, 0.006),)
    blows = [Blow(3.0, 0.2), Blow(at_s), Blow(41.0)]
    signal = recorded(blows, 60.0, modes=slow)
    whole = find_taps(signal, RATE_HZ, full_scale=None)
    assert_same(find_taps_in(source(signal)), whole, start_s=0.02, end_s=1.5)


def test_blows_without_any_pause_are_all_found():
    """Every second and a half for a minute, before the last one has died away."""
    slow = (Made(9.0, 0.012), Made(31.0, 0.006))
    blows = [Blow(4.0 + 1.5 * i, 0.5 + 0.5 * (i % 3)) for i in range(40)]
    signal = recorded(blows, 75.0, modes=slow)
    whole, ours = find_taps(signal, RATE_HZ, full_scale=None), find_taps_in(source(signal))
    assert [t.at_s for t in whole.taps] == pytest.approx([b.at_s for b in blows], abs=0.01)
    assert [t.at_s for t in ours.taps] == pytest.approx([b.at_s for b in blows], abs=0.01)
    alike = [a.usable == b.usable for a, b in zip(ours.taps, whole.taps, strict=True)]
    assert np.mean(alike) > 0.9


def test_machine_that_starts_half_way_ends_the_search_nowhere():
    """What never dies away again is the new background; blows before and after are found."""
    blows = [Blow(5.0), Blow(15.0), Blow(140.0), Blow(152.0)]
    signal = recorded(blows, 170.0)
    machine = hum(len(signal), RATE_HZ, 24.63, [0.06, 0.03])
    signal[int(30 * RATE_HZ) :] += machine[int(30 * RATE_HZ) :]
    found = np.array([t.at_s for t in find_taps_in(source(signal)).taps])
    for blow in blows:
        assert np.min(np.abs(found - blow.at_s)) < 0.015


def test_background_is_the_quiet_before_the_first_blow_half_a_minute_at_most():
    ours = find_taps_in(source(recorded([Blow(70.0), Blow(80.0)], 95.0)))
    first, past = ours.background
    assert past == pytest.approx(70.0 * RATE_HZ, abs=0.1 * RATE_HZ)
    assert past - first == 30 * RATE_HZ
    assert ours.noise_rms == pytest.approx(3e-4 * np.sqrt(RATE_HZ / 2), rel=0.1)


def test_background_after_a_decay_where_nothing_lies_before():
    blows = [Blow(0.05), Blow(6.0), Blow(40.0)]
    ours = find_taps_in(source(recorded(blows, 50.0)))
    first, past = ours.background
    assert 9 * RATE_HZ < first < past <= 40 * RATE_HZ


@pytest.mark.parametrize("seed", range(3))
def test_noise_and_hum_alone_hold_no_blow(seed):
    rng = np.random.default_rng(seed)
    signal = coloured(rng, 240_000, RATE_HZ, 1e-3, seed) + hum(240_000, RATE_HZ, 50.0, [0.1, 0.02])
    search = find_taps_in(source(signal))
    assert search.taps == ()
    assert search.background == (0, 240_000)
    assert search.noise_rms > 0


def test_silence_holds_no_blow():
    assert find_taps_in(source(np.zeros(100_000))).taps == ()


def test_clipped_blow_is_refused_in_its_stretch():
    signal = recorded([Blow(5.0, 0.2), Blow(45.0, 1.0), Blow(60.0, 0.2)], 70.0)
    signal *= 1.6 / np.abs(signal).max()
    ours = find_taps_in(source(np.clip(signal, -1.0, 1.0), full_scale=1.0))
    assert [t.usable for t in ours.taps] == [True, False, True]
    assert ours.taps[1].reasons[0].startswith("clipped: ")


def test_tick_that_only_a_quiet_stretch_brings_out_is_not_shown():
    """As in the whole: a click a hundred times weaker than the blows, a minute after them."""
    signal = recorded([Blow(5.0)], 100.0)
    signal[int(70 * RATE_HZ) : int(70 * RATE_HZ) + 4] += 0.02 * np.abs(signal).max()
    assert len(find_taps(signal, RATE_HZ, full_scale=None).taps) == 1
    assert len(find_taps_in(source(signal)).taps) == 1


def test_missing_frames_refuse_the_tap_they_are_in_and_leave_the_background_whole():
    signal = recorded([Blow(25.0), Blow(50.0)], 65.0)
    gaps = [(int(10 * RATE_HZ), int(10 * RATE_HZ)), (int(51 * RATE_HZ), int(51 * RATE_HZ))]
    ours = find_taps_in(source(signal), gaps=gaps)
    assert_same(ours, find_taps(signal, RATE_HZ, full_scale=None, gaps=gaps))
    assert [t.usable for t in ours.taps] == [True, False]
    assert ours.background[0] == 10 * RATE_HZ


def test_kept_taps_are_those_of_the_whole():
    signal = recorded([Blow(5.0), Blow(15.0), Blow(15.1, 0.6), Blow(33.0)], 45.0)
    search = find_taps_in(source(signal))
    records = cut_from(source(signal), 1, search, "a.wav")
    usable = [t for t in search.taps if t.usable]
    assert len(records) == len(usable) == 2
    for record, tap in zip(records, usable, strict=True):
        np.testing.assert_array_equal(record.samples, signal[tap.start : tap.end])
        assert record.background is records[0].background
        assert record.source == "a.wav"
    np.testing.assert_array_equal(records[0].background, signal[slice(*search.background)])
    assert what_was_cut(search, records) == ()


def test_no_more_taps_are_kept_than_memory_allows(monkeypatch):
    """Those kept are spread over the recording, first and last among them; a note says so."""
    signal = recorded([Blow(3.0 + 5.0 * i) for i in range(10)], 56.0)
    search = find_taps_in(source(signal))
    assert sum(t.usable for t in search.taps) == 10
    monkeypatch.setattr(long_taps, "MOST_TAPS", 4)
    records = cut_from(source(signal), 1, search)
    kept = [0, 3, 6, 9]
    for record, i in zip(records, kept, strict=True):
        tap = search.taps[i]
        np.testing.assert_array_equal(record.samples, signal[tap.start : tap.end])
    (note,) = what_was_cut(search, records)
    assert "4 of 10 usable taps" in note
    monkeypatch.setattr(long_taps, "MOST_SAMPLES", 3 * len(records[0].samples))
    assert 1 <= len(cut_from(source(signal), 1, search)) <= 3


def test_progress_rises_and_a_wish_to_stop_is_heeded_at_the_next_stretch():
    signal = recorded([Blow(3.0 + 12.0 * i) for i in range(7)], 100.0)
    told: list[float] = []

    def step(_message: str, fraction: float) -> None:
        told.append(fraction)

    find_taps_in(source(signal), progress=Progress(step))
    assert told[0] == 0.0
    assert told == sorted(told)
    assert len(told) >= 100.0 / 20.0
    told.clear()
    with pytest.raises(Cancelled):
        find_taps_in(source(signal), progress=Progress(step, lambda: len(told) >= 2))
    assert len(told) == 2


def test_file_on_disk_gives_what_its_samples_give(tmp_path: Path):
    signal = recorded([Blow(5.0), Blow(25.0), Blow(47.0)], 60.0)
    signal *= 0.8 / np.abs(signal).max()
    path = tmp_path / "a.flac"
    soundfile.write(path, signal, int(RATE_HZ), subtype="PCM_24")
    whole = find_taps(signal, RATE_HZ)
    ours = find_taps_in(open_recording(path))
    assert [t.at_s for t in ours.taps] == pytest.approx([t.at_s for t in whole.taps], abs=1e-4)
    assert [t.usable for t in ours.taps] == [True] * 3


def test_channel_that_is_not_there_is_refused():
    with pytest.raises(InputError, match="no channel 2"):
        find_taps_in(source(np.zeros(1000)), 2)
