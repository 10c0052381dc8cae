"""Modes are found with honest uncertainty, and what is no mode is refused with its reason."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest

from fieldkit.errors import Refusal
from fieldkit.signal.modes import MeasuredMode, ModeEstimate, TapRecord, estimate_modes
from fieldkit.signal.taps import cut, find_taps
from tests.signal.made_taps import Blow, Made, coloured, hum, tap_recording

RATE_HZ = 2400.0
STRENGTHS = (1.0, 0.6, 1.3, 0.8)


def records(
    modes: Sequence[Made],
    *,
    strengths: Sequence[float] = STRENGTHS,
    rate_hz: float = RATE_HZ,
    duration_s: float = 6.0,
    density: float = 1e-3,
    exponent: float = 0.0,
    tones: Sequence[tuple[float, float]] = (),
    quiet_s: float = 3.0,
    seed: int = 0,
) -> list[TapRecord]:
    """Free decays after the contact, in coloured noise with steady tones that run on through."""
    rng = np.random.default_rng(seed)
    count, quiet = round(duration_s * rate_hz), round(quiet_s * rate_hz)

    def surroundings(length: int) -> np.ndarray:
        noise = coloured(rng, max(length, 2), rate_hz, density, exponent)[:length]
        for frequency_hz, amplitude in tones:
            noise += hum(length, rate_hz, frequency_hz, [amplitude], rng.uniform(0, 6))
        return noise

    background = surroundings(quiet)
    out = []
    for strength in strengths:
        decay = tap_recording(modes, [Blow(0.0, strength, 0.002)], duration_s, rate_hz)
        start = round(0.004 * rate_hz)
        out.append(TapRecord((decay + surroundings(count))[start:], rate_hz, background))
    return out


def near(estimate: ModeEstimate, frequency_hz: float) -> MeasuredMode:
    return min(estimate.modes, key=lambda m: abs(m.frequency_hz - frequency_hz))


def assert_holds(mode: MeasuredMode, made: Made, deviations: float = 4.0) -> None:
    assert mode.damping_ratio is not None
    assert mode.damping_sd is not None
    assert abs(mode.frequency_hz - made.frequency_hz) < deviations * mode.frequency_sd_hz
    assert abs(mode.damping_ratio - made.damping_ratio) < deviations * mode.damping_sd
    assert mode.frequency_sd_hz < 0.1 * made.frequency_hz * made.damping_ratio
    assert mode.damping_sd < 0.1 * made.damping_ratio


def assert_found(estimate: ModeEstimate, modes: Sequence[Made], deviations: float = 4.0) -> None:
    """Just these modes, each within its stated uncertainty."""
    assert len(estimate.modes) == len(modes)
    for made in modes:
        assert_holds(near(estimate, made.frequency_hz), made, deviations)


MODES = (Made(8.7, 0.009, 1.0), Made(31.0, 0.015, 0.8, 0.5), Made(112.0, 0.01, 0.5, 2.0))


@pytest.mark.parametrize("exponent", [0.0, 1.0])
def test_modes_in_white_and_pink_noise(exponent: float) -> None:
    estimate = estimate_modes(records(MODES, exponent=exponent))
    assert_found(estimate, MODES)
    assert estimate.tones == ()
    assert [m.frequency_hz for m in estimate.modes] == sorted(
        m.frequency_hz for m in estimate.modes
    )
    assert all(m.taps == 4 for m in estimate.modes)


@pytest.mark.parametrize("rate_hz", [250.0, 400.0, 1000.0, 12000.0])
def test_any_rate(rate_hz: float) -> None:
    """The rate of the recording does not matter as long as it holds the modes."""
    modes = [m for m in MODES if m.frequency_hz < 0.4 * rate_hz]
    assert_found(estimate_modes(records(modes, rate_hz=rate_hz)), modes)


def test_records_of_different_rates_and_lengths() -> None:
    mixed = [
        *records(MODES, strengths=[1.0, 0.7]),
        *records(MODES, strengths=[1.1], rate_hz=3200.0, duration_s=4.0, seed=1),
    ]
    assert_found(estimate_modes(mixed), MODES)


def test_clean_records_give_the_modes_exactly() -> None:
    """Without noise every digit that matters is right, and nothing is added."""
    estimate = estimate_modes(records(MODES, density=0.0))
    assert len(estimate.modes) == 3
    for made in MODES:
        mode = near(estimate, made.frequency_hz)
        assert mode.frequency_hz == pytest.approx(made.frequency_hz, rel=1e-6)
        assert mode.damping_ratio == pytest.approx(made.damping_ratio, rel=1e-4)


def test_strength_is_the_share_of_decay_energy() -> None:
    """Energy of a decay is A^2 / (4 zeta omega); contact and phase change it little here."""
    modes = (Made(20.0, 0.01, 1.0), Made(60.0, 0.01, 0.5))
    estimate = estimate_modes(records(modes))
    assert estimate.modes[0].strength == 1.0
    assert estimate.modes[1].strength == pytest.approx(0.25 / 3, rel=0.1)


@pytest.mark.parametrize("bandwidths", [2.0, 3.0])
def test_pair_is_resolved(bandwidths: float) -> None:
    """Two planes of a pipe: a few half-power bandwidths apart, taps of differing shares."""
    zeta = 0.01
    pair = [Made(40.0, zeta), Made(40.0 * (1 + 2 * zeta * bandwidths), zeta, 0.7, 1.0)]
    shares = [(1.0, 0.7), (0.5, 1.0), (0.8, -0.6)]
    taps = [
        records([Made(40.0, zeta, a), Made(pair[1].frequency_hz, zeta, b, 1.0)],
                strengths=[1.0], seed=i)[0]
        for i, (a, b) in enumerate(shares)
    ]  # fmt: skip
    assert_found(estimate_modes(taps), pair)


def test_pair_is_resolved_with_one_tap() -> None:
    pair = [Made(40.0, 0.01), Made(41.6, 0.01, 0.7, 1.0)]
    estimate = estimate_modes(records(pair, strengths=[1.0], density=3e-4))
    assert_found(estimate, pair)


def test_unresolved_pair_is_one_mode_and_says_so() -> None:
    """A fifth of a bandwidth apart nobody can tell them apart: one mode, and the word for it."""
    pair = [Made(40.0, 0.01), Made(40.0 * 1.004, 0.01, 0.7, 1.0)]
    estimate = estimate_modes(records(pair, density=1e-4))
    assert len(estimate.modes) == 1
    mode = estimate.modes[0]
    for made in pair:
        assert abs(mode.frequency_hz - made.frequency_hz) < 2.5 * mode.frequency_sd_hz
    assert mode.frequency_sd_hz < 0.4
    assert any("may be two" in w for w in estimate.warnings)
    assert not any("drifts" in w for w in estimate.warnings)


@pytest.mark.parametrize("mains_hz", [50.0, 60.0])
@pytest.mark.parametrize("offset_hz", [-1.0, 1.0])
def test_mode_beside_hum(mains_hz: float, offset_hz: float) -> None:
    """A mode 1 Hz from mains hum of its own size is found, and the hum is called a tone."""
    made = Made(mains_hz + offset_hz, 0.006, 0.5)
    hummed = records([made], tones=[(mains_hz * 1.0003, 0.2), (3 * mains_hz, 0.1)])
    estimate = estimate_modes(hummed)
    assert_found(estimate, [made])
    assert [t.frequency_hz for t in estimate.tones] == pytest.approx(
        [t for t in (mains_hz * 1.0003, 3 * mains_hz) if t <= 200.0], abs=0.02
    )


def test_machine_that_runs_on_is_tones() -> None:
    lines = [(24.6, 0.1), (49.2, 0.06), (73.8, 0.03)]
    estimate = estimate_modes(records(MODES, tones=lines))
    assert_found(estimate, MODES)
    assert [t.frequency_hz for t in estimate.tones] == pytest.approx(
        [f for f, _ in lines], abs=0.02
    )
    assert all(t.strength < 0.2 for t in estimate.tones)


def test_tones_of_every_recording_are_known() -> None:
    """Two recordings of the same pipe, a machine in the second only."""
    quiet = records(MODES, strengths=[1.0, 0.7])
    loud = records(MODES, strengths=[0.9, 1.2], tones=[(24.6, 0.1)], seed=1)
    estimate = estimate_modes([*quiet, *loud])
    assert_found(estimate, MODES)
    assert [t.frequency_hz for t in estimate.tones] == pytest.approx([24.6], abs=0.02)


def test_tones_and_noise_alone_are_no_modes() -> None:
    estimate = estimate_modes(records([], tones=[(50.0, 0.3), (24.3, 0.1)]))
    assert estimate.modes == ()
    assert [t.frequency_hz for t in estimate.tones] == pytest.approx([24.3, 50.0], abs=0.02)


def test_tone_without_quiet_time_before_the_blow_is_no_mode() -> None:
    """It does not decay, and that is enough; the missing quiet time is said."""
    estimate = estimate_modes(records(MODES, tones=[(50.0, 0.2)], quiet_s=0.0))
    assert_found(estimate, MODES)
    assert [t.frequency_hz for t in estimate.tones] == pytest.approx([50.0], abs=0.02)
    assert any("no quiet time before the blow" in w for w in estimate.warnings)


@pytest.mark.parametrize("seed", range(12))
@pytest.mark.parametrize("exponent", [0.0, 1.0, 2.0])
def test_noise_alone_is_no_mode(seed: int, exponent: float) -> None:
    quiet_s = 3.0 if seed % 2 else 0.0
    noise = records([], exponent=exponent, seed=seed, quiet_s=quiet_s, duration_s=4.0)
    assert estimate_modes(noise).modes == ()


def test_contact_left_in_the_record_is_no_mode() -> None:
    """A pulse of a few milliseconds at the start of every record adds nothing."""
    pulse = np.sin(np.pi * np.arange(8) / 8)
    spoiled = []
    for record in records(MODES):
        samples = record.samples.copy()
        samples[:8] += 2.0 * pulse
        spoiled.append(TapRecord(samples, RATE_HZ, record.background))
    assert_found(estimate_modes(spoiled), MODES, deviations=5.0)


def test_what_one_of_several_taps_shows_is_refused() -> None:
    """A clatter after one blow rings like a mode, yet no other tap has it."""
    taps = records(MODES)
    clatter = tap_recording([Made(57.0, 0.01, 0.5)], [Blow(0.0)], 6.0, RATE_HZ)
    first = taps[0]
    taps[0] = TapRecord(first.samples + clatter[: len(first.samples)], RATE_HZ, first.background)
    estimate = estimate_modes(taps)
    assert_found(estimate, MODES)
    refused = [r for r in estimate.refused if abs(r.frequency_hz - 57.0) < 0.5]
    assert len(refused) == 1
    assert refused[0].reason.startswith("seen in one of 4 taps only")


def test_tap_struck_again_unnoticed_is_left_out() -> None:
    """A second blow amid the third decay: the modes come from the other taps, and it is said."""
    taps = records(MODES)
    again = tap_recording(MODES, [Blow(0.9, 0.7)], 6.0, RATE_HZ)
    third = taps[2]
    taps[2] = TapRecord(third.samples + again[: len(third.samples)], RATE_HZ, third.background)
    estimate = estimate_modes(taps)
    assert_found(estimate, MODES)
    assert estimate.warnings[0].startswith("usable tap 3 of 4 was left out")
    assert len([w for w in estimate.warnings if "left out" in w]) == 1


def test_taps_that_disagree_widen_the_uncertainty_and_are_named() -> None:
    """A support with play: frequency falls with the strength of the blow."""
    taps = []
    for i, strength in enumerate([0.4, 0.6, 0.8, 1.0, 1.2]):
        made = Made(31.0 * (1 - 0.004 * strength), 0.008, 1.0)
        taps += records([made], strengths=[strength], seed=i, density=3e-4)
    estimate = estimate_modes(taps)
    assert len(estimate.modes) == 1
    mode = estimate.modes[0]
    assert 30.85 < mode.frequency_hz < 30.95
    assert 0.01 < mode.frequency_sd_hz < 0.06
    assert any("falls with the strength of the blow" in w for w in estimate.warnings)


def drifting(
    made: Made, drift: float, strengths: Sequence[float], seed: int = 0, density: float = 3e-4
) -> list[TapRecord]:
    """Decays whose frequency departs by ``drift`` times the amplitude, relative."""
    rng = np.random.default_rng(seed)
    background = coloured(rng, 7200, RATE_HZ, density)
    time_s = np.arange(round(5 * RATE_HZ)) / RATE_HZ
    natural = 2 * np.pi * made.frequency_hz
    turn = np.sqrt(1 - made.damping_ratio**2)
    out = []
    for strength in strengths:
        size = strength * np.exp(-made.damping_ratio * natural * time_s)
        lead = drift * (strength - size) / made.damping_ratio
        free = made.amplitude * size * np.cos(turn * (natural * time_s + lead) + made.phase)
        noise = coloured(rng, len(free), RATE_HZ, density)
        out.append(TapRecord(free + noise, RATE_HZ, background))
    return out


@pytest.mark.parametrize("drift", [-0.02, -0.006, 0.01])
def test_frequency_that_drifts_inside_each_decay_is_said(drift: float) -> None:
    """A support with play: one mode with its true damping, its interval from blow to end."""
    made = Made(24.0, 0.01)
    estimate = estimate_modes(drifting(made, drift, [1.0, 0.6, 0.8]))
    assert len(estimate.modes) == 1
    mode = estimate.modes[0]
    assert mode.damping_ratio is not None
    assert mode.damping_sd is not None
    for frequency_hz in (24.0, 24.0 * (1 + drift)):
        assert abs(mode.frequency_hz - frequency_hz) < 2.2 * mode.frequency_sd_hz
    assert abs(mode.damping_ratio - 0.01) < 4 * mode.damping_sd
    assert mode.damping_sd < 0.001
    assert any("drifts inside each decay" in w for w in estimate.warnings)


def test_frequency_that_does_not_drift_is_not_said_to() -> None:
    for seed in range(6):
        estimate = estimate_modes(records(MODES, seed=seed))
        assert not any("drifts" in w for w in estimate.warnings)


@pytest.mark.parametrize("seed", range(3))
def test_machine_whose_speed_wanders_is_no_mode(seed: int) -> None:
    """Lines that move by a thousandth, one a few bandwidths from a mode."""
    rng = np.random.default_rng(seed)
    count, quiet = round(6 * RATE_HZ), round(4 * RATE_HZ)
    time_s = np.arange(quiet + 4 * count) / RATE_HZ
    slow = np.cumsum(np.cos(2 * np.pi * 0.13 * time_s + seed) * np.sqrt(2e-6)) / RATE_HZ
    around = coloured(rng, len(time_s), RATE_HZ, 1e-3)
    for order, size in enumerate([0.1, 0.06, 0.03], start=1):
        around += size * np.cos(2 * np.pi * 29.3 * order * (time_s + slow) + order)
    taps = []
    for k, strength in enumerate(STRENGTHS):
        decay = tap_recording(MODES, [Blow(0.0, strength, 0.002)], 6.0, RATE_HZ)
        own = decay + around[quiet + k * count : quiet + (k + 1) * count]
        taps.append(TapRecord(own[10:], RATE_HZ, around[:quiet]))
    assert_found(estimate_modes(taps), MODES, deviations=5.0)


def test_what_hardly_decays_over_the_record_is_refused_in_so_many_words() -> None:
    """A chime cut off after a twentieth of a decay: no tone, for it was not there before."""
    chime = Made(81.3, 2e-4)
    estimate = estimate_modes(records([chime], duration_s=0.5))
    assert estimate.modes == ()
    assert estimate.tones == ()
    assert [r.frequency_hz for r in estimate.refused] == pytest.approx([81.3], abs=0.02)
    assert estimate.refused[0].reason.startswith("rings on after the blow with hardly any decay")
    assert "record until it has died away" in estimate.refused[0].reason


def test_one_tap_is_warned_about() -> None:
    estimate = estimate_modes(records(MODES, strengths=[1.0]))
    assert_found(estimate, MODES)
    assert any(w.startswith("only one tap") for w in estimate.warnings)


def test_only_the_asked_range_is_reported() -> None:
    estimate = estimate_modes(records(MODES), low_hz=10.0, high_hz=50.0)
    assert [round(m.frequency_hz) for m in estimate.modes] == [31]


def test_strong_mode_above_the_range_does_no_harm() -> None:
    loud = [*MODES, Made(230.0, 0.01, 5.0)]
    assert_found(estimate_modes(records(loud)), MODES)


def test_no_tap_is_refused_with_what_to_record() -> None:
    with pytest.raises(Refusal, match="no usable tap") as refusal:
        estimate_modes([])
    assert "record" in refusal.value.measure_next


def test_intervals_hold_what_they_promise() -> None:
    """95 % intervals of three modes over 25 noises hold 88 % at least."""
    inside = []
    for seed in range(25):
        estimate = estimate_modes(records(MODES, seed=seed, strengths=[1.0, 0.7], density=3e-3))
        for made in MODES:
            mode = near(estimate, made.frequency_hz)
            assert mode.damping_ratio is not None
            assert mode.damping_sd is not None
            inside.append(abs(mode.frequency_hz - made.frequency_hz) < 1.96 * mode.frequency_sd_hz)
            inside.append(abs(mode.damping_ratio - made.damping_ratio) < 1.96 * mode.damping_sd)
    assert np.mean(inside) >= 0.88


@pytest.mark.parametrize("rate_hz", [400.0, 8000.0, 192000.0])
def test_from_recording_to_modes(rate_hz: float) -> None:
    """Good, double and clipped taps in one recording: the good ones alone give the modes."""
    blows = [Blow(2.0, 0.8), Blow(6.5, 0.5), Blow(6.6, 0.4), Blow(11.0, 3.0), Blow(15.5, 0.6)]
    if rate_hz > 10000:
        blows = blows[:3]
    signal = tap_recording(MODES, blows, blows[-1].at_s + 4.0, rate_hz) / 2
    signal += coloured(np.random.default_rng(2), len(signal), rate_hz, 2e-4)
    signal = np.clip(signal, -1.0, 1.0)
    search = find_taps(signal, rate_hz)
    assert [t.usable for t in search.taps] == [True, False, False, True][: len(search.taps)]
    assert_found(estimate_modes(cut(signal, rate_hz, search)), MODES)
