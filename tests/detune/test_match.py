"""The match finds what was hidden, and says what it does not know."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune import posterior
from fieldkit.detune.evidence import Evidence
from fieldkit.detune.match import grouped, match
from fieldkit.detune.posterior import Problem, Seen
from fieldkit.detune.reduced import build
from fieldkit.detune.unknowns import Unknown
from fieldkit.errors import Refusal
from fieldkit.progress import Progress
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import Support
from fieldkit.span.modes import span_modes
from tests.detune.lines import (
    RUNNING,
    TAPPED,
    UP_TO_HZ,
    booster,
    evidence_of,
    hidden,
    matched,
    riser,
    straight,
)


def test_every_measured_mode_is_paired_inside_its_interval():
    _, _, found = booster()
    assert not found.unpaired
    for pair in found.pairs:
        assert pair.low_hz <= pair.measured.frequency_hz * 1.01
        assert pair.high_hz >= pair.measured.frequency_hz * 0.99
        assert pair.direction == pair.measured.direction


def test_the_running_state_is_predicted_from_the_tapped_one():
    """Each running mode of the hidden span lies within 3 % of the ensemble's median."""
    span, truth, found = booster()
    model = build(span, RUNNING, _unknowns(span), UP_TO_HZ)
    predicted = np.median(model.modes(found.ensemble.standard).frequency_hz, axis=0)
    actual = [mode.frequency_hz for mode in span_modes(truth, RUNNING, 60.0)]
    assert predicted[predicted > 0.2][: len(actual)] == pytest.approx(actual, rel=0.03)


def _unknowns(span):
    from fieldkit.detune.unknowns import unknowns_of

    return unknowns_of(span, (TAPPED, RUNNING))


def test_a_known_stiffness_is_recovered_within_one_per_cent():
    """Frequencies synthesised for a stiffness give it back when nothing else is in doubt."""
    k = 1.1e6
    stated = Support(4.1, "free", vertical="unknown", lateral=8e6)
    base = straight()
    span = replace(
        base,
        supports=(
            Support(0.0, "anchor", vertical=5e8, lateral=5e8, axial=5e8, rotation=2e6),
            stated,
            Support(8.4, "free", vertical=5e6, lateral=2e6),
        ),
    )
    truth = replace(
        span, supports=(span.supports[0], replace(stated, vertical=k), span.supports[2])
    )
    index = next(u.index for u in _unknowns(span) if u.role == "spring")
    spring = Unknown("clamp", "N/m", "spring", index, 2e6, 1.7)
    known = tuple(
        Unknown(u.name, u.unit, u.role, u.index, u.centre, 0.0)
        for u in _unknowns(span)
        if u.role == "mass"
    )
    model = build(span, TAPPED, (spring, *known), 60.0)
    modes = [
        MeasuredMode(m.frequency_hz, 1e-4 * m.frequency_hz, 0.01, 0.001, "vertical", taps=5)
        for m in span_modes(truth, TAPPED, 60.0)
        if m.direction == "vertical"
    ]
    (group,) = grouped(modes, 60.0)
    rows = _rows(model, span)
    problem = Problem((model,), (Seen(group.peaks, 0, rows[0], rows[1]),))
    drawn = posterior.sample(problem, np.random.default_rng(1), Progress())
    best = drawn.z[np.argmax(drawn.log_likelihood), :1]
    assert spring.at(best)[0] == pytest.approx(k, rel=0.01)


def _rows(model, span):
    stations = np.linspace(0, span.length_m, 25)
    vertical = np.concatenate([model.structure.motion_rows(s, "vertical") for s in stations])
    every = np.concatenate(
        [model.structure.motion_rows(s, a) for s in stations for a in ("vertical", "lateral")]
    )
    return vertical @ model.basis / 5, every @ model.basis / 5


def test_a_missing_and_a_false_peak_do_no_harm():
    span, truth, _ = booster()
    seen = evidence_of(truth, 6).modes
    intruder = MeasuredMode(43.3, 0.02, 0.01, 0.001, "vertical", taps=5)
    kept = tuple(sorted((*seen[:2], *seen[3:], intruder), key=lambda m: m.frequency_hz))
    found = matched(span, Evidence(kept))
    assert [mode.frequency_hz for mode in found.unpaired] == [43.3]
    assert any("43.30 Hz" in text for text in found.warnings)
    clamp = _parameter(found, "support 3 lateral at 8.4 m")
    assert clamp.informed


def test_what_the_tap_cannot_see_is_not_called_informed():
    _, _, found = booster()
    assert not _parameter(found, "elastic modulus").informed
    assert not _parameter(found, "support 1 vertical at 0 m").informed
    assert _parameter(found, "support 3 lateral at 8.4 m").informed


def _parameter(found, name):
    return next(p for p in found.parameters if p.name == name)


def test_a_bent_span_is_matched_too():
    span = riser()
    truth = hidden(span, 8)
    found = matched(span, evidence_of(truth, 9))
    assert len(found.pairs) >= 0.8 * len(found.measured)


def test_a_tap_of_another_pipe_is_refused():
    peaks = tuple(
        MeasuredMode(f, 0.01, 0.01, 0.001, "vertical", taps=5) for f in (3.1, 3.9, 5.2, 6.6, 7.7)
    )
    with pytest.raises(Refusal, match="no plausible model"):
        matched(straight(), Evidence(peaks))


def test_nothing_measured_is_refused_with_what_to_do():
    with pytest.raises(Refusal, match="tap test"):
        matched(straight(), Evidence())


def test_the_same_evidence_gives_the_same_ensemble():
    span, truth, found = booster()
    again = match(span, TAPPED, RUNNING, evidence_of(truth, 6), up_to_hz=UP_TO_HZ)
    assert np.array_equal(found.ensemble.standard, again.ensemble.standard)


def test_two_stations_say_no_more_of_the_model_than_one():
    """The model errs in a mode wherever it is measured: error over root of stations stays."""
    at = [MeasuredMode(20.0, 0.01, 0.01, 0.001, "vertical", taps=5, at_m=x) for x in (1.0, 2.0)]
    lateral = MeasuredMode(30.0, 0.01, 0.01, 0.001, "lateral", taps=5, at_m=1.0)
    one = grouped(at[:1], 100.0)[0].peaks.model_error
    several = [group.peaks for group in grouped([*at, lateral], 100.0)]
    assert several[0].model_error / 2**0.5 == pytest.approx(one)
    assert several[2].model_error == pytest.approx(one)
