"""Blows are found, cut, and refused with reasons an engineer can act on."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.taps import TapSearch, cut, find_taps
from tests.signal.made_taps import Blow, Made, coloured, hum, tap_recording

MODES = (Made(17.3, 0.012, 1.0), Made(41.0, 0.01, 0.6, 0.8), Made(163.0, 0.008, 0.5, 2.0))


def recorded(
    blows: list[Blow],
    *,
    rate_hz: float = 8000.0,
    duration_s: float | None = None,
    density: float = 3e-4,
    exponent: float = 0.0,
    seed: int = 0,
    modes: tuple[Made, ...] = MODES,
) -> np.ndarray:
    duration_s = duration_s or blows[-1].at_s + 5.0
    clean = tap_recording(modes, blows, duration_s, rate_hz)
    noise = coloured(np.random.default_rng(seed), len(clean), rate_hz, density, exponent)
    return clean + noise


def times(search: TapSearch) -> list[float]:
    return [t.at_s for t in search.taps]


FIVE = [Blow(2.0 + 4.5 * i, s, c) for i, (s, c) in enumerate(
    [(1.0, 0.002), (0.3, 0.004), (0.8, 0.001), (0.5, 0.005), (1.2, 0.003)]
)]  # fmt: skip


@pytest.mark.parametrize("rate_hz", [100.0, 400.0, 1000.0, 8000.0, 48000.0])
def test_every_blow_is_found_at_its_time(rate_hz: float) -> None:
    """Soft and hard blows, at rates from 100 Hz up, within a few milliseconds or samples."""
    modes = tuple(m for m in MODES if m.frequency_hz < 0.45 * rate_hz)
    signal = recorded(FIVE, rate_hz=rate_hz, modes=modes)
    search = find_taps(signal, rate_hz, full_scale=None)
    assert times(search) == pytest.approx([b.at_s for b in FIVE], abs=max(0.015, 6 / rate_hz))
    assert all(t.usable for t in search.taps)


def test_192_khz() -> None:
    """The highest rate a recorder gives works as the others do."""
    signal = recorded(FIVE[:2], rate_hz=192000.0)
    search = find_taps(signal, 192000.0, full_scale=None)
    assert times(search) == pytest.approx([b.at_s for b in FIVE[:2]], abs=0.015)


@pytest.mark.parametrize(
    ("background", "exponent"), [("pink", 1.0), ("hum", 0.0), ("machine", 1.0)]
)
def test_blows_are_found_in_a_background(background: str, exponent: float) -> None:
    """Pink noise, strong mains hum and a running machine hide no blow and make none."""
    signal = recorded(FIVE, exponent=exponent, density=1e-3)
    if background == "hum":
        signal += hum(len(signal), 8000.0, 50.02, [0.3, 0.05, 0.1])
    if background == "machine":
        signal += hum(len(signal), 8000.0, 24.63, [0.1, 0.08, 0.03, 0.02])
    search = find_taps(signal, 8000.0, full_scale=None)
    assert times(search) == pytest.approx([b.at_s for b in FIVE], abs=0.015)


def test_free_decay_starts_after_the_contact() -> None:
    """The record begins when the hammer has left, and not much later."""
    search = find_taps(recorded(FIVE), 8000.0, full_scale=None)
    for tap, blow in zip(search.taps, FIVE, strict=True):
        late_s = tap.start / 8000.0 - blow.at_s - blow.contact_s
        assert -0.002 < late_s < 0.008


def test_background_lies_before_the_first_blow_and_has_its_level() -> None:
    search = find_taps(recorded(FIVE), 8000.0, full_scale=None)
    first, past = search.background
    assert first == 0
    assert 1.5 * 8000 < past < 2.0 * 8000
    assert search.noise_rms == pytest.approx(3e-4 * np.sqrt(4000), rel=0.1)


def test_background_after_a_full_decay_where_nothing_lies_before() -> None:
    blows = [Blow(0.05), Blow(6.0)]
    search = find_taps(recorded(blows, density=3e-3), 8000.0, full_scale=None)
    first, past = search.background
    assert past - first > 8000
    assert past <= 6.0 * 8000


def test_record_ends_before_the_next_blow() -> None:
    search = find_taps(recorded(FIVE), 8000.0, full_scale=None)
    for tap, following in zip(search.taps, FIVE[1:], strict=False):
        assert tap.end <= following.at_s * 8000


def only_reason(search: TapSearch, index: int) -> str:
    tap = search.taps[index]
    assert not tap.usable
    assert len(tap.reasons) == 1
    return tap.reasons[0]


@pytest.mark.parametrize("rail", [1.0, 0.4])
@pytest.mark.parametrize("full_scale", [1.0, None])
def test_clipped_blow_is_refused(rail: float, full_scale: float | None) -> None:
    """At full scale, at a rail below it, and where nobody knows the full scale."""
    signal = recorded([Blow(2.0, 0.2), Blow(7.0, 1.0)])
    signal *= 1.6 * rail / np.abs(signal).max()
    search = find_taps(np.clip(signal, -rail, rail), 8000.0, full_scale=full_scale)
    assert search.taps[0].usable
    assert only_reason(search, 1).startswith("clipped: ")


def test_clipping_behind_a_noisy_stage_is_refused() -> None:
    """A preamplifier that clips leaves flat tops with the converter's noise on them."""
    signal = recorded([Blow(2.0, 0.2), Blow(7.0, 1.0)])
    signal = np.clip(signal / np.abs(signal).max(), -0.6, 0.6)
    signal += 1e-4 * np.random.default_rng(1).standard_normal(len(signal))
    search = find_taps(signal, 8000.0)
    assert search.taps[0].usable
    assert only_reason(search, 1).startswith("clipped: ")


def test_smooth_tops_are_not_clipping() -> None:
    """A slow wave sampled fast stays near its top for many samples; that is no rail."""
    slow = (Made(6.0, 0.01, 1.0, 0.0),)
    signal = recorded([Blow(2.0)], rate_hz=48000.0, modes=slow, density=1e-6)
    signal = np.round(signal / np.abs(signal).max() * 32767) / 32768
    search = find_taps(signal, 48000.0)
    assert not any("clipped" in r for t in search.taps for r in t.reasons)


@pytest.mark.parametrize("gap_s", [0.02, 0.06, 0.15, 0.28])
@pytest.mark.parametrize("share", [0.3, 0.8])
def test_double_blow_is_refused(gap_s: float, share: float) -> None:
    signal = recorded([Blow(2.0), Blow(7.0), Blow(7.0 + gap_s, share), Blow(12.0)])
    search = find_taps(signal, 8000.0, full_scale=None)
    assert [t.usable for t in search.taps] == [True, False, True]
    assert only_reason(search, 1).startswith("struck twice: ")


def test_cut_short_blow_is_refused() -> None:
    signal = recorded([Blow(2.0), Blow(7.0)], duration_s=7.3)
    search = find_taps(signal, 8000.0, full_scale=None)
    assert search.taps[0].usable
    assert only_reason(search, 1).startswith("cut short: ")


def test_overlapped_blow_is_refused_when_little_is_left() -> None:
    slow = (Made(6.0, 0.005),)
    signal = recorded([Blow(2.0), Blow(2.6), Blow(9.0)], modes=slow, duration_s=24.0)
    search = find_taps(signal, 8000.0, full_scale=None)
    assert only_reason(search, 0).startswith("overlapped: ")
    assert search.taps[2].usable


def test_early_next_blow_still_leaves_a_usable_decay() -> None:
    """Where most of the decay is over, what lies before the next blow is used."""
    signal = recorded([Blow(2.0), Blow(3.6), Blow(8.0)])
    search = find_taps(signal, 8000.0, full_scale=None)
    assert [t.usable for t in search.taps] == [True, True, True]
    assert search.taps[0].end < 3.6 * 8000


def test_weak_blow_is_refused() -> None:
    """A click that excites nothing is a blow, yet too weak to use."""
    signal = recorded([Blow(2.0)], density=1e-3)
    signal[5 * 8000 : 5 * 8000 + 4] += 0.8
    search = find_taps(signal, 8000.0, full_scale=None)
    assert search.taps[0].usable
    assert any(r.startswith("too weak: ") for t in search.taps[1:] for r in t.reasons)


@pytest.mark.parametrize("seed", range(4))
def test_noise_and_hum_alone_hold_no_blow(seed: int) -> None:
    rng = np.random.default_rng(seed)
    signal = coloured(rng, 80000, 8000.0, 1e-3, seed % 3) + hum(80000, 8000.0, 50.0, [0.1, 0.02])
    search = find_taps(signal, 8000.0, full_scale=None)
    assert search.taps == ()
    assert search.background == (0, 80000)


def test_silence_holds_no_blow() -> None:
    assert find_taps(np.zeros(1000), 1000.0).taps == ()
    assert find_taps(np.full(1000, 0.25), 1000.0).taps == ()


def test_cut_gives_the_usable_decays_with_their_background() -> None:
    signal = recorded([Blow(2.0), Blow(7.0), Blow(7.1, 0.5), Blow(12.0)])
    search = find_taps(signal, 8000.0, full_scale=None)
    records = cut(signal, 8000.0, search, source="tap-1.flac")
    assert len(records) == 2
    assert all(r.source == "tap-1.flac" and r.rate_hz == 8000.0 for r in records)
    assert len(records[0].background) == search.background[1] - search.background[0]
    assert np.array_equal(records[0].samples, signal[search.taps[0].start : search.taps[0].end])


@pytest.mark.parametrize(("gap_s", "share"), [(0.05, 0.3), (0.08, 0.5), (0.12, 0.3), (0.2, 0.3)])
@pytest.mark.parametrize("seed", range(3))
def test_double_blow_in_noise_is_refused(gap_s: float, share: float, seed: int) -> None:
    """No sample stands out at the second blow; that all lines change at once does."""
    blows = [Blow(2.0), Blow(7.0), Blow(7.0 + gap_s, share), Blow(12.0)]
    search = find_taps(recorded(blows, density=1.5e-3, seed=seed), 8000.0, full_scale=None)
    assert [t.usable for t in search.taps] == [True, False, True]
    assert only_reason(search, 1).startswith("struck twice: ")


@pytest.mark.parametrize("seed", range(4))
def test_many_beating_modes_are_no_double_blow(seed: int) -> None:
    """Sixteen modes, eight of them neighbours of the others, beat while they decay."""
    rng = np.random.default_rng(seed)
    some = np.exp(rng.uniform(np.log(6.0), np.log(900.0), 8))
    both = np.concatenate([some, some * rng.uniform(1.01, 1.06, 8)])
    modes = tuple(Made(f, rng.uniform(0.004, 0.02), rng.uniform(0.3, 1.0)) for f in both)
    search = find_taps(recorded(FIVE[:3], modes=modes, seed=seed), 8000.0, full_scale=None)
    assert [t.usable for t in search.taps] == [True] * 3


@pytest.mark.parametrize("contact_s", [0.01, 0.018, 0.025])
def test_long_contact_is_no_double_blow(contact_s: float) -> None:
    """A soft head is felt when it lands and when it leaves."""
    modes = (Made(7.3, 0.012), Made(17.0, 0.01, 0.6), Made(33.0, 0.012, 0.4))
    blows = [Blow(2.0, 1.0, contact_s), Blow(7.0, 0.6, contact_s), Blow(12.0, 0.8, contact_s)]
    search = find_taps(recorded(blows, modes=modes), 8000.0, full_scale=None)
    assert len(search.taps) == 3
    assert not any("struck twice" in r for t in search.taps for r in t.reasons)


def test_two_clipped_samples_are_enough() -> None:
    """At a low rate a short contact stays at the rail for two samples."""
    signal = recorded([Blow(2.0), Blow(7.0)], rate_hz=2000.0)
    first = int(7.0 * 2000) + 8
    signal[first : first + 4] += [0.6, 3.0, 3.0, 0.4]
    signal = np.clip(signal, -1.7, 1.7)
    search = find_taps(signal, 2000.0, full_scale=None)
    assert search.taps[0].usable
    assert any(r.startswith("clipped: ") for r in search.taps[1].reasons)


def test_single_samples_at_one_rail_are_clipping() -> None:
    """High modes leave the rail after each sample: tops of one height, none just below it."""
    modes = (Made(2500.0, 0.002), Made(3100.0, 0.002, 0.8), Made(40.0, 0.01, 0.5))
    signal = recorded([Blow(2.0, 0.3, 1e-4), Blow(7.0, 1.0, 1e-4)], modes=modes)
    signal = np.clip(signal, -0.75 * np.abs(signal).max(), 0.75 * np.abs(signal).max())
    search = find_taps(signal, 8000.0, full_scale=None)
    assert search.taps[0].usable
    assert any(r.startswith("clipped: ") for r in search.taps[1].reasons)


@pytest.mark.parametrize("seed", range(4))
def test_burst_of_noise_is_no_blow(seed: int) -> None:
    """A hand on the sensor for a third of a second, some twenty times as loud as the noise."""
    rng = np.random.default_rng(seed)
    time_s = np.arange(80000) / 8000.0
    swell = 1 + 20 * np.exp(-0.5 * ((time_s - 5.0) / 0.15) ** 2)
    signal = swell * coloured(rng, 80000, 8000.0, 1e-3)
    assert find_taps(signal, 8000.0, full_scale=None).taps == ()


def test_silence_after_a_blow_gives_no_warning() -> None:
    """A noise-free decay falls by more decibels than a number holds as a ratio."""
    signal = recorded([Blow(2.0), Blow(7.0)], density=0.0)
    assert len(find_taps(signal * 1e150, 8000.0, full_scale=None).taps) == 2


def test_blow_that_stays_at_the_rail_is_clipped_and_no_noise() -> None:
    """Far over full scale it is at the rail for a second, and as hard to foresee as noise."""
    signal = recorded([Blow(3.0, 1.0), Blow(9.0, 0.05), Blow(15.0, 1.0)], duration_s=22.0)
    signal *= 12 / np.abs(signal).max()
    search = find_taps(np.clip(signal, -1.0, 1.0), 8000.0)
    assert times(search) == pytest.approx([3.0, 9.0, 15.0], abs=0.015)
    assert [t.usable for t in search.taps] == [False, True, False]
    assert search.background[1] < 3.0 * 8000
