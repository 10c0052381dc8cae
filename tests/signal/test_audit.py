"""Taps that decay freely for a while only are used for that long."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.audit import free_until
from fieldkit.signal.modes import TapRecord, estimate_modes
from tests.signal.made_taps import Blow, Made, coloured, tap_recording

RATE_HZ = 500.0
MODES = (Made(3.51, 0.027, 1.0), Made(5.42, 0.02, 0.8), Made(7.53, 0.0127, 0.9))


def unnoticed(gap_s: float, seed: int) -> TapRecord:
    """A decay of 2.5 s in which an equal blow strikes again."""
    blows = [Blow(2.0, 1.0, 0.003), Blow(2.0 + gap_s, 0.9, 0.003)]
    clean = tap_recording(MODES, blows, 4.5, RATE_HZ)
    samples = clean + coloured(np.random.default_rng(seed), len(clean), RATE_HZ, 0.02, 0.0)
    start = int(2.01 * RATE_HZ)
    return TapRecord(samples[start:], RATE_HZ, samples[: int(1.95 * RATE_HZ)])


def test_blows_nobody_noticed_make_no_false_modes() -> None:
    """Where all taps hold one, what lies before it gives the modes, with a word of warning."""
    gaps_s = (1.35, 1.29, 1.2, 1.19)
    estimate = estimate_modes([unnoticed(g, i) for i, g in enumerate(gaps_s)], high_hz=100.0)
    assert [m.frequency_hz for m in estimate.modes] == pytest.approx(
        [m.frequency_hz for m in MODES], rel=5e-3
    )
    assert any("do not decay as modes do for longer than" in text for text in estimate.warnings)


@pytest.mark.parametrize(
    ("misfits", "free_s"),
    [
        ([1.1], None),
        ([30.0, 32.0, 1.5], pytest.approx(0.98)),
        ([30.0, 35.0, 28.0, 1.5], None),
        ([90.0, 50.0, 30.0, 20.0, 12.0], None),
    ],
)
def test_shorter_until_decays_explain_the_taps(misfits: list[float], free_s: object) -> None:
    """Not where all is well, nor where shorter records are hardly better, nor down to nothing."""
    left = iter(misfits[1:])
    assert free_until([2.0, 2.0, 5.0], misfits[0], lambda _: next(left)) == free_s
