"""Peaks seen while running: used, and never against what a tap says."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.likelihood import MODEL_ERROR, detection
from fieldkit.detune.match import grouped, running_weight
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.modes import span_modes
from tests.detune.lines import RUNNING, TAPPED, UP_TO_HZ, booster, evidence_of, matched


def seen_running(truth, scale=1.0):
    """The first modes of the true pipe in its running state, as a running record gives them."""
    return tuple(
        MeasuredMode(
            scale * mode.frequency_hz,
            2e-3 * mode.frequency_hz,
            0.012,
            0.003,
            mode.direction,
            state="running",
            source="running",
        )
        for mode in span_modes(truth, RUNNING, UP_TO_HZ)[:5]
        if mode.direction in ("vertical", "lateral")
    )


def widths(found):
    """Relative width of the interval of every tapped mode."""
    return np.array([(m.high_hz - m.low_hz) / m.median_hz for m in found.tapped_modes])


def test_running_peaks_stand_apart_and_are_trusted_less():
    """Same direction, state and station: still a group of their own, wider and easier to lose."""
    tap = MeasuredMode(20.0, 0.02, 0.01, 0.001, "vertical", taps=5, state="running", at_m=1.0)
    running = replace(tap, frequency_hz=20.1, taps=0, source="running")
    firm, weak = (group.peaks for group in grouped((tap, running), 100.0))
    assert firm.model_error == MODEL_ERROR < weak.model_error
    assert firm.false_rate[0] < weak.false_rate[0]
    assert weak.shown < firm.shown == 1.0
    share, at_hz = np.array([[1.0]]), np.array([[20.0]])
    assert detection(share, at_hz, 100.0, weak.shown) < detection(share, at_hz, 100.0)


@pytest.mark.parametrize(("taps", "running", "weight"), [(0, 5, 1.0), (1, 5, 0.1), (8, 2, 1.0)])
def test_running_peaks_together_weigh_at_most_half_of_the_taps(taps, running, weight):
    """Alone they count in full."""
    tap = MeasuredMode(20.0, 0.02, 0.01, 0.001, "vertical", taps=5)
    modes = (tap,) * taps + (replace(tap, taps=0, source="running"),) * running
    assert running_weight(modes) == pytest.approx(weight)


def test_running_peaks_of_another_pipe_do_not_move_the_match():
    """Every running peak 12 % off: the tapped modes stay where the taps put them."""
    span, truth, found = booster()
    taps = evidence_of(truth, 6).modes
    misled = matched(span, Evidence((*taps, *seen_running(truth, 1.12))))
    kept = [mode.median_hz for mode in found.tapped_modes][:5]
    now = [mode.median_hz for mode in misled.tapped_modes][:5]
    assert now == pytest.approx(kept, rel=0.01)
    assert not any("belongs to no computed mode" in text for text in misled.warnings)


def test_running_peaks_are_compared_with_the_running_model():
    """Full of water the same mode lies lower: it is paired all the same, near its own value."""
    span, truth, _ = booster()
    found = matched(span, Evidence((*evidence_of(truth, 6).modes, *seen_running(truth))))
    pairs = [pair for pair in found.pairs if pair.measured.source == "running"]
    assert len(pairs) >= 3
    for pair in pairs:
        assert pair.model_hz == pytest.approx(pair.measured.frequency_hz, rel=0.03)
        assert pair.low_hz < pair.model_hz < pair.high_hz
    tapped = {round(m.frequency_hz, 3) for m in span_modes(truth, TAPPED, UP_TO_HZ)}
    assert tapped.isdisjoint({round(p.measured.frequency_hz, 3) for p in pairs})


def test_without_a_tap_the_running_record_answers_alone_wide_and_with_a_warning():
    """Better than nothing, less than a tap."""
    span, truth, tapped = booster()
    alone = matched(span, Evidence(seen_running(truth)))
    assert any("nothing was tapped" in text for text in alone.warnings)
    assert np.median(widths(alone)[:5]) > np.median(widths(tapped)[:5])
    true_hz = [mode.frequency_hz for mode in span_modes(truth, TAPPED, UP_TO_HZ)][:2]
    for mode, hz in zip(alone.tapped_modes, true_hz, strict=False):
        assert mode.low_hz < hz < mode.high_hz
