"""A calibrated level is screened against each line, with its source, and never called safe."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from fieldkit.detune.severity import SCREENING_CAUTION, Level, LineLevel, screenings
from fieldkit.span.layout import State
from fieldkit.span.materials import material
from tests.detune.lines import straight

RUNNING = State("running")


def level(*lines, overall=None):
    told = tuple(LineLevel(hz, 1e-3 * mm) for hz, mm in lines)
    rms = math.sqrt(sum(one.rms_m_per_s**2 for one in told))
    return Level(told, overall or rms, 2.0, 1000.0)


def by_name(found):
    return {one.criterion: one for one in found}


def test_every_criterion_names_its_source_and_what_it_applies_to():
    found = screenings(level((49.0, 9.0)), straight(), RUNNING)
    assert [one.criterion for one in found] == [
        "velocity-stress",
        "ASME OM part 3 style velocity",
        "process pipework guideline",
        "ISO 20816-8 zones, dampers and piping",
        "API 618 design line",
    ]
    assert all(one.source and one.applies_to and one.from_memory for one in found)
    words = " ".join((*(f"{o.note} {o.applies_to}" for o in found), SCREENING_CAUTION)).lower()
    assert "safe " not in words
    assert "acceptable" not in words
    assert "responsible piping engineer" in words


def test_without_a_span_only_what_needs_none_is_told():
    assert len(screenings(level((49.0, 9.0)), None, None)) == 3


def test_the_peak_takes_all_lines_at_once():
    """9 and 12 mm/s rms: sqrt 2 times their sum, not of the root of squares."""
    assert level((20.0, 9.0), (60.0, 12.0)).peak_m_per_s == pytest.approx(1e-3 * 21 * math.sqrt(2))
    assert level((20.0, 1.0), overall=5e-3).peak_m_per_s == pytest.approx(5e-3 * math.sqrt(2))


@pytest.mark.parametrize(
    ("rms_mm", "above"), [(9.0, ()), (12.0, ("concern",)), (60.0, ("concern", "problem"))]
)
def test_the_guideline_says_which_lines_are_exceeded(rms_mm, above):
    """50 Hz: concern 10.57, problem 51.60 mm/s rms."""
    found = by_name(screenings(level((50.0, rms_mm)), None, None))["process pipework guideline"]
    assert (found.above, found.at_hz) == (above, 50.0)


def test_the_line_nearest_its_limit_decides_and_not_the_strongest():
    """4 mm/s at 5 Hz exceeds 3.58; 6 mm/s at 60 Hz does not exceed 11.5."""
    found = by_name(screenings(level((60.0, 6.0), (5.0, 4.0)), None, None))
    assert found["process pipework guideline"].at_hz == 5.0
    assert found["process pipework guideline"].above == ("concern",)


def test_the_design_line_is_peak_to_peak():
    """12 mm/s rms is 33.9 mm/s peak to peak, above 32."""
    found = by_name(screenings(level((50.0, 12.0)), None, None))["API 618 design line"]
    assert found.value == pytest.approx(2 * math.sqrt(2) * 12e-3)
    assert found.above == ("design line",)


def test_lines_outside_a_criterion_are_left_out():
    """API 618 ends at 200 Hz, the guideline at 300 Hz."""
    found = by_name(screenings(level((250.0, 12.0)), None, None))
    assert "API 618 design line" not in found
    assert "process pipework guideline" in found
    assert "process pipework guideline" not in by_name(screenings(level((400.0, 9.0)), None, None))


def test_the_zones_apply_to_reciprocating_compressor_systems_only():
    found = by_name(screenings(level((20.0, 20.0)), None, None))
    zones = found["ISO 20816-8 zones, dampers and piping"]
    assert zones.above == ("zone A/B", "zone B/C")
    assert "reciprocating compressor systems only" in zones.applies_to


def test_other_material_gets_a_stress_without_a_line():
    span = replace(straight(), material=material("PVC-U"))
    found = by_name(screenings(level((20.0, 20.0)), span, RUNNING))
    assert found["velocity-stress"].limits == ()
    assert "PVC-U" in found["velocity-stress"].note


def test_concentrated_masses_are_said_not_to_be_covered():
    found = by_name(screenings(level((20.0, 20.0)), straight(), RUNNING))
    assert "check valve" in found["velocity-stress"].note
    bare = replace(straight(), masses=())
    assert (
        "not covered"
        not in by_name(screenings(level((20.0, 9.0)), bare, RUNNING))["velocity-stress"].note
    )


def test_a_force_below_the_first_mode_is_held_to_a_lower_velocity():
    """C5: first mode at 40 Hz, strongest line at 20 Hz, half the velocity."""
    span, name = straight(), "ASME OM part 3 style velocity"
    free = by_name(screenings(level((20.0, 9.0)), span, RUNNING, 15.0))[name].limits[0].value
    below = by_name(screenings(level((20.0, 9.0)), span, RUNNING, 40.0))[name].limits[0].value
    assert below == pytest.approx(0.5 * free)
