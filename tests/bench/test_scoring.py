"""The accuracy bench counts what it says, and its peak picking is a fair one."""

from __future__ import annotations

import numpy as np
import pytest

from fieldkit.signal.modes import MeasuredMode, ModeEstimate
from tests.bench.accuracy.bound import ModeBound
from tests.bench.accuracy.estimating import Estimated
from tests.bench.accuracy.peak_picking import pick
from tests.bench.accuracy.recordings import Simulated, TrueBlow, TrueMode
from tests.bench.accuracy.scoring import Score, scored
from tests.bench.accuracy.surroundings import Density
from tests.bench.accuracy.tally import Tally, covered, robust, trimmed

WELL_KNOWN = ModeBound(0.002, 1e-4, 50.0)


def measured(frequency_hz: float, sd_hz: float = 0.002) -> MeasuredMode:
    return MeasuredMode(frequency_hz, sd_hz, 0.01, 1e-4)


def recorded(*modes: TrueMode, mains_hz: float = 0.0) -> Simulated:
    blow = TrueBlow(1.0, False, False, True, 1000, 5000, np.ones(len(modes), complex))
    density = Density(((1e-6, 0.0),))
    return Simulated(
        np.zeros(5000), 1000.0, 200.0, modes, (blow,), density, (), mains_hz, (0.0, 0.0), (0, 999)
    )


def score(made: Simulated, *found: MeasuredMode, bound: ModeBound = WELL_KNOWN) -> Score:
    said = Estimated(ModeEstimate(found, ()), None, 0.1)
    return scored(made, [bound] * len(made.modes), said, ())


def test_second_estimate_of_one_mode_is_false() -> None:
    got = score(recorded(TrueMode(20.0, 0.01)), measured(20.001), measured(20.05))
    assert len(got.found) == 1
    assert got.false_hz == (20.05,)
    assert got.found[0].frequency_ratio == pytest.approx(0.5)


def test_estimate_beyond_half_a_bandwidth_is_false_and_the_mode_missed() -> None:
    got = score(recorded(TrueMode(20.0, 0.01)), measured(20.3))
    assert got.missed_hz == (20.0,)
    assert got.false_hz == (20.3,)


def test_wide_interval_does_not_make_a_far_estimate_right() -> None:
    """Beyond two bandwidths nothing is of the mode, whatever it says of itself."""
    got = score(recorded(TrueMode(20.0, 0.01)), measured(21.0, sd_hz=5.0))
    assert got.missed_hz == (20.0,)


def test_false_mode_at_a_mains_multiple_is_counted_as_such() -> None:
    made = recorded(TrueMode(20.0, 0.01), mains_hz=50.0)
    got = score(made, measured(20.0), measured(100.1), measured(120.0))
    assert got.false_hz == (100.1, 120.0)
    assert got.false_at_mains_hz == (100.1,)


def test_one_estimate_for_two_that_the_bound_cannot_part_is_not_false() -> None:
    """Nor are the two counted as estimable."""
    pair = recorded(TrueMode(20.0, 0.01), TrueMode(20.1, 0.01))
    got = score(pair, measured(20.05), bound=ModeBound(0.05, 1e-3, 40.0))
    assert got.estimable == 0
    assert got.false_hz == ()


@pytest.mark.parametrize("bound", [ModeBound(0.002, 1e-4, 24.0), ModeBound(0.2, 1e-4, 40.0)])
def test_modes_too_weak_or_too_near_are_not_asked_for(bound: ModeBound) -> None:
    made = recorded(TrueMode(20.0, 0.01), TrueMode(21.0, 0.01))
    assert score(made, bound=bound).estimable == 0


def test_robust_ratios_are_one_for_normal_errors() -> None:
    errors = np.random.default_rng(1).standard_normal(20_000)
    assert robust(errors) == pytest.approx(1.0, abs=0.03)
    assert trimmed(errors) == pytest.approx(1.0, abs=0.02)
    assert covered(list(errors)) == pytest.approx(0.95, abs=0.006)
    assert np.isnan(Tally(()).frequency_coverage)


@pytest.mark.parametrize("damping", [0.002, 0.01, 0.03])
def test_peak_picking_reads_a_clean_decay_right(damping: float) -> None:
    """The half-power width of a mode that rings out in the record is twice its damping."""
    mode = TrueMode(30.0, damping)
    decay = np.real(np.exp(mode.pole * np.arange(40_000) / 500.0))
    (peak, *_) = pick([decay], 500.0, 2.0, 200.0, 1)
    assert peak.frequency_hz == pytest.approx(30.0, rel=0.002)
    assert peak.damping_ratio == pytest.approx(damping, rel=0.05)
