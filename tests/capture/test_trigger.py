"""The armed trigger: threshold, exact records, and the same for blocks of any size."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.capture.trigger import (
    ARMED,
    LEAST_THRESHOLD,
    LISTENING,
    BlowSeen,
    Event,
    RecordBroken,
    RecordDone,
    Trigger,
    proposed_length_s,
)

RATE_HZ = 2000
NOISE = 1e-3


def struck(*at: int, count: int = 20000, size: float = 0.3, decay_per_s: float = 4.0) -> np.ndarray:
    """Noise with free decays that begin with a jump at exact samples."""
    samples = NOISE * np.random.default_rng(3).standard_normal(count)
    for start in at:
        time_s = np.arange(count - start) / RATE_HZ
        samples[start:] += size * np.exp(-decay_per_s * time_s) * np.cos(2 * np.pi * 40 * time_s)
    return samples


def events(samples: np.ndarray, cuts: list[int], trigger: Trigger | None = None) -> list[Event]:
    trigger = trigger or Trigger(rate_hz=RATE_HZ, quiet_s=2.0)
    edges = [0, *sorted(cuts), len(samples)]
    return [e for a, b in pairwise(edges) for e in trigger.feed(a, samples[a:b])]


def test_a_blow_is_seen_at_its_sample_and_the_record_holds_the_quiet_before() -> None:
    """Pre-trigger of 0.25 s and two quiet seconds, counted from the very sample of the blow."""
    seen, done = events(struck(7003), [])
    assert seen == BlowSeen(7003)
    assert isinstance(done, RecordDone)
    assert (done.first, done.blow) == (7003 - round(2.25 * RATE_HZ), 7003)
    assert done.died_away


@settings(max_examples=8, deadline=None)
@given(cuts=st.lists(st.integers(0, 20000), max_size=60), at=st.integers(4500, 9000))
def test_blocks_of_any_size_give_the_same_records(cuts: list[int], at: int) -> None:
    """Where the stream is cut must not matter to a single sample."""
    samples = struck(at, at + 9000)
    assert events(samples, cuts) == events(samples, [])


def test_a_blow_inside_the_hold_off_belongs_to_the_earlier_one() -> None:
    """The second blow, 1.5 s later, makes no record of its own."""
    found = events(struck(7000, 10000), [])
    assert [type(e) for e in found] == [BlowSeen, RecordDone]
    assert found[1].end > 10000


def test_the_record_is_not_longer_than_proposed() -> None:
    """Set to 2.5 s, a decay that goes on for longer is cut there, to the sample."""
    trigger = Trigger(rate_hz=RATE_HZ)
    trigger.record_s = 2.5
    done = events(struck(7003, decay_per_s=0.5), [], trigger)[1]
    assert isinstance(done, RecordDone)
    assert done.end - done.blow == round(2.5 * RATE_HZ)
    assert not done.died_away


def test_records_do_not_share_samples() -> None:
    """The quiet before the second blow ends where the first record does."""
    first, second = (e for e in events(struck(6000, 12500), []) if isinstance(e, RecordDone))
    assert second.first == max(first.end, second.blow - round(2.25 * RATE_HZ))


@pytest.mark.parametrize("seed", range(5))
def test_noise_alone_triggers_nothing(seed: int) -> None:
    """Thirty seconds of normal noise pass in peace."""
    trigger = Trigger(rate_hz=RATE_HZ)
    noise = NOISE * np.random.default_rng(seed).standard_normal(30 * RATE_HZ)
    assert events(noise, [], trigger) == []
    assert trigger.phase == ARMED


def test_the_threshold_is_never_below_some_steps_of_the_converter() -> None:
    """A dead input has a background of nothing."""
    trigger = Trigger(rate_hz=RATE_HZ)
    events(np.zeros(3 * RATE_HZ), [], trigger)
    (threshold,) = trigger.thresholds
    assert threshold.size == LEAST_THRESHOLD


def test_a_blow_amid_a_running_machine_is_seen_by_its_suddenness() -> None:
    """A 25 Hz vibration as large as the blow itself does not hide it."""
    time_s = np.arange(20000) / RATE_HZ
    found = events(struck(9000, size=0.3) + 0.3 * np.sin(2 * np.pi * 25 * time_s), [])
    assert found[0] == BlowSeen(9000)


def test_an_offset_of_the_input_is_no_blow() -> None:
    """Half of full scale of direct voltage, and the threshold stays where the noise puts it."""
    trigger = Trigger(rate_hz=RATE_HZ)
    found = events(struck(7003) + 0.5, [], trigger)
    assert found[0] == BlowSeen(7003)


def test_a_level_that_rises_for_good_is_listened_to_anew() -> None:
    """A machine that was switched on becomes the background."""
    samples = struck(count=30 * RATE_HZ)
    time_s = np.arange(len(samples)) / RATE_HZ
    samples[8000:] += 0.1 * np.sin(2 * np.pi * 24 * time_s[8000:])
    trigger = Trigger(rate_hz=RATE_HZ)
    trigger.record_s = 3.0
    events(samples, [], trigger)
    assert trigger.phase == ARMED
    (threshold,) = trigger.thresholds
    assert threshold.level == pytest.approx(0.1, rel=0.1)


def test_frames_that_are_lost_break_the_record() -> None:
    """The blow is told as broken, and nothing before the gap is ever part of a later record."""
    samples = struck(7003, 15000)
    trigger = Trigger(rate_hz=RATE_HZ)
    found = trigger.feed(0, samples[:8000])
    found += trigger.feed(8000, samples[9000:], "the input overflowed")
    broken = found[1]
    assert broken == RecordBroken(7003, 8000, "the input overflowed")
    done = found[3]
    assert isinstance(done, RecordDone)
    assert done.blow == 14000
    assert done.first >= 8000


def test_it_is_not_armed_before_it_has_listened() -> None:
    """Two seconds, so that a background is known."""
    trigger = Trigger(rate_hz=RATE_HZ)
    events(struck(count=round(1.9 * RATE_HZ)), [], trigger)
    assert trigger.phase == LISTENING


def test_record_length_is_six_time_constants_of_the_slowest_mode() -> None:
    """Trethewey and Cafeo 1992; 40 Hz at 1 % decays with 2.513 a second."""
    assert proposed_length_s(np.array([2.513, 8.0])) == pytest.approx(6 / 2.513)
    assert proposed_length_s(np.array([0.01])) == 30.0
    assert proposed_length_s(np.array([50.0])) == 2.0


def test_the_loudest_of_several_channels_decides() -> None:
    """A blow that only the second one shows is seen, its record lasts until that one is quiet."""
    rng = np.random.default_rng(3)
    alone = 1e-3 * rng.standard_normal((12 * RATE_HZ, 2))
    time_s = np.arange(6 * RATE_HZ) / RATE_HZ
    alone[5 * RATE_HZ : 11 * RATE_HZ, 1] += (
        0.3 * np.exp(-1.5 * time_s) * np.cos(2 * np.pi * 30 * time_s)
    )
    trigger = Trigger(rate_hz=RATE_HZ, channels=2)
    events = trigger.feed(0, alone)
    assert [type(event) for event in events] == [BlowSeen, RecordDone]
    seen, done = events
    assert seen.frame == 5 * RATE_HZ
    assert done.died_away
    assert done.end - done.blow > 2.5 * RATE_HZ
    assert len(trigger.thresholds) == 2
    first = Trigger(rate_hz=RATE_HZ).feed(0, alone[:, 0])
    assert first == []
