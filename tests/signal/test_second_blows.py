"""Second blows that no short stretch shows are told once the modes are known."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.modes import ModeEstimate, TapRecord, estimate_modes
from tests.signal.made_taps import Blow, Made, coloured, tap_recording

RATE_HZ = 2000.0
MODES = (Made(4.0, 0.02, 1.0), Made(27.0, 0.012, 0.8), Made(110.0, 0.006, 0.5))
FIRST_S = 1.0


def record(
    second: Blow | None, contact_s: float, start_s: float, seed: int, density: float = 2e-4
) -> TapRecord:
    """One tap that starts so long after its blow, in noise, with or without a second blow."""
    rng = np.random.default_rng(seed)
    blows = [Blow(FIRST_S, 0.7 + 0.1 * seed, contact_s)]
    if second:
        blows.append(Blow(FIRST_S + second.at_s, second.strength, second.contact_s))
    clean = tap_recording(MODES, blows, 6.0, RATE_HZ)
    samples = clean + coloured(rng, len(clean), RATE_HZ, density)
    quiet, early, start = (
        round(s * RATE_HZ) for s in (FIRST_S - 0.1, FIRST_S - 0.03, FIRST_S + start_s)
    )
    return TapRecord(
        samples[start:],
        RATE_HZ,
        samples[:quiet],
        before=samples[early:start],
        since_blow_s=start / RATE_HZ - FIRST_S,
    )


def estimate(
    second: Blow | None, *, taps: int = 4, contact_s: float = 0.002, start_s: float = 0.016
) -> ModeEstimate:
    """What is said of taps of which the second is struck twice."""
    seconds = [second if k == 1 else None for k in range(taps)]
    starts_s = [start_s if twice else contact_s + 0.001 for twice in seconds]
    records = [
        record(twice, contact_s, begin_s, seed)
        for seed, (twice, begin_s) in enumerate(zip(seconds, starts_s, strict=True))
    ]
    return estimate_modes(records)


@pytest.mark.parametrize("after_s", [0.009, 0.013, 0.021])
def test_a_soon_second_blow_is_told_with_its_delay(after_s: float) -> None:
    """Where the decay was taken from after it, nothing but the modes tells it."""
    said = estimate(Blow(after_s, 0.4, 0.002), start_s=0.03)
    assert said.struck_twice == (1,)
    warning = next(w for w in said.warnings if "struck twice" in w)
    assert warning.startswith("usable tap 2 of 4 was struck twice: a second blow ")
    told_ms = float(warning.split("a second blow ")[1].split(" ms")[0])
    assert told_ms == pytest.approx(1000 * after_s, abs=2.0)


@pytest.mark.parametrize("after_s", [0.02, 0.06, 0.18])
def test_a_decay_that_a_second_blow_interrupts_is_left_out(after_s: float) -> None:
    """The second of four taps is named as struck again."""
    said = estimate(Blow(after_s, 0.4, 0.002), start_s=0.004)
    assert any(w.startswith("usable tap 2 of 4") and "struck" in w for w in said.warnings)


def test_a_tap_struck_twice_spoils_no_mode() -> None:
    """All modes of the other taps stand, and no more than these."""
    said = estimate(Blow(0.06, 0.8, 0.002), start_s=0.004)
    assert [m.frequency_hz for m in said.modes] == pytest.approx(
        [m.frequency_hz for m in MODES], rel=1e-3
    )


@pytest.mark.parametrize("contact_s", [0.001, 0.004, 0.008])
def test_taps_struck_once_are_not_accused(contact_s: float) -> None:
    """Neither a short contact nor a long one looks like two blows."""
    said = estimate(None, contact_s=contact_s)
    assert said.struck_twice == ()
    assert not any("struck twice" in w for w in said.warnings)


def test_a_contact_that_was_taken_for_shorter_is_no_second_blow() -> None:
    """All taps show it alike: it is the hammer's."""
    records = [record(None, 0.009, 0.012, seed) for seed in range(4)]
    assert estimate_modes(records).struck_twice == ()


def test_a_single_tap_tells_no_soon_second_blow() -> None:
    """It might be the end of a long contact."""
    soon = estimate_modes([record(Blow(0.012, 0.5, 0.002), 0.002, 0.02, 1)])
    assert soon.struck_twice == ()
