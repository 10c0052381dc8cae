"""Lost frames are found by the clock; late ones are not taken for lost."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from fieldkit.capture.clock import LEAST_LOSS_S, FrameClock

RATE_HZ = 48000
BLOCK = 480


def found(losses, *, seconds=20.0, drift=0.0, late_s=0.0, silence_s=0.0, seed=0):
    """What the clock says of blocks that come late at random, some frames lost at some frame.

    Five times nothing arrives for ``silence_s``, and then all that was held up.
    """
    rng = np.random.default_rng(seed)
    clock = FrameClock(RATE_HZ)
    pending = dict(losses)
    silences = 3.0 + (seconds - 3.0) * rng.random(5)
    lost, told, before_s = 0, [], 0.0
    for number in range(round(seconds * RATE_HZ / BLOCK)):
        frame = number * BLOCK
        for at in [at for at in pending if at <= frame]:
            lost += pending.pop(at)
        due_s = (frame + BLOCK + lost) / (RATE_HZ * (1 + drift))
        held_up = [begun for begun in silences if begun <= due_s < begun + silence_s]
        ready_s = max((begun + silence_s for begun in held_up), default=due_s)
        before_s = max(before_s, ready_s + late_s * rng.random() ** 2)
        says = clock.feed(before_s, BLOCK)
        if says is not None:
            told.append((frame + BLOCK, *says))
    return told


@settings(max_examples=25)
@given(
    seed=st.integers(0, 1000),
    drift=st.floats(-3e-4, 3e-4),
    late_s=st.floats(0.0, 0.1),
    silence_s=st.floats(0.0, 2.0),
)
def test_late_frames_and_slow_clocks_are_no_losses(seed, drift, late_s, silence_s):
    assert found({}, drift=drift, late_s=late_s, silence_s=silence_s, seed=seed) == []


@settings(max_examples=25)
@example(seed=0, late_s=0.078125, at=197281, lost=3840)
@given(
    seed=st.integers(0, 1000),
    late_s=st.floats(0.0, 0.1),
    at=st.integers(3 * RATE_HZ, 10 * RATE_HZ),
    lost=st.integers(round(1.6 * LEAST_LOSS_S * RATE_HZ), 5 * RATE_HZ),
)
def test_a_loss_is_found_where_it_is(seed, late_s, at, lost):
    """How much it was is known within a part of how late frames come: in no second are all late."""
    told = found({at: lost}, late_s=late_s, seed=seed)
    within = (0.01 + 0.3 * late_s) * RATE_HZ
    assert sum(count for _, count, _ in told) == pytest.approx(lost, abs=within)
    frame, _, within = told[0]
    assert frame - within <= at + 2 * BLOCK
    assert told[-1][0] >= at


def test_small_losses_add_up():
    losses = {(3 + k) * RATE_HZ: RATE_HZ // 100 for k in range(15)}
    told = found(losses)
    assert sum(count for _, count, _ in told) == pytest.approx(0.15 * RATE_HZ, rel=0.4)


def test_frames_that_are_late_for_a_second_and_a_half_are_no_loss():
    """A computer that is busy for so long delivers everything 0.2 s late, and then catches up."""
    clock = FrameClock(RATE_HZ)
    for number in range(1000):
        due_s = (number + 1) * BLOCK / RATE_HZ
        late_s = 0.2 if 4.2 < due_s < 5.7 else 0.0
        assert clock.feed(due_s + late_s, BLOCK) is None
