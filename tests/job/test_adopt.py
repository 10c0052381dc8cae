"""A chosen fix written into the job file."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields, is_dataclass
from typing import Any

import pytest

from fieldkit.detune.fixes import (
    AddMass,
    AddSupport,
    AllOf,
    MoveMass,
    MoveSupport,
    SetMass,
    StiffenSupport,
)
from fieldkit.errors import InputError, Refusal
from fieldkit.job.store import JobText
from fieldkit.span.layout import Span
from fieldkit.span.supports import springs
from tests.job.sample import FULL


def close(a: Any, b: Any) -> bool:
    """Equal, numbers within the digits that a job file keeps."""
    if isinstance(a, (float, int)) and isinstance(b, (float, int)):
        return a == b or abs(a - b) <= 2e-6 * max(abs(a), abs(b))
    if is_dataclass(a):
        return all(close(getattr(a, f.name), getattr(b, f.name)) for f in fields(a))
    if isinstance(a, tuple):
        return len(a) == len(b) and all(map(close, a, b))
    return bool(a == b)


CHANGES = [
    AddSupport(2.05, vertical_n_per_m=3.98107e6, lateral_n_per_m=4e6),
    AddSupport(1.234567, rotation_n_m_per_rad=2.5e5, axial_n_per_m=1e6),
    MoveSupport(1, 3.4),
    StiffenSupport(1, vertical_n_per_m=2e7, rotation_n_m_per_rad=1e6),
    AddMass(1.5, 12.345),
    SetMass(0, 7.7),
    MoveMass(0, 3.21),
    AllOf((MoveSupport(1, 3.4), AddMass(1.5, 12.345))),
    AllOf((AddSupport(2.05, lateral_n_per_m=4e6), StiffenSupport(1, vertical_n_per_m=2e7))),
]


@pytest.mark.parametrize("change", CHANGES, ids=repr)
@pytest.mark.parametrize("units", ["SI", "US"])
def test_the_adopted_job_is_the_changed_span(change: Any, units: str) -> None:
    """Read back, the job is the span that the fix was judged on, in either system of units."""
    text = JobText(FULL.replace('units = "SI"', f'units = "{units}"'))
    judged: Span = change.apply(text.job().span)
    adopted = text.with_change(change).job().span
    assert close(springs(adopted), springs(judged))
    assert close(adopted.masses, judged.masses)
    assert close(adopted.legs, judged.legs)


def test_an_adopted_change_speaks_the_units_of_the_job() -> None:
    """What is written into the file is what the user would have typed."""
    change = AddSupport(2.05, vertical_n_per_m=4e6)
    assert JobText(FULL).with_change(change).rows("support")[-1] == {
        "at": "2.05 m",
        "kind": "free",
        "vertical": "4.0 MN/m",
    }
    us = JobText(FULL.replace('units = "SI"', 'units = "US"')).with_change(change)
    assert us.rows("support")[-1]["vertical"].endswith("kip/in")


def test_a_mass_set_to_nothing_is_taken_out() -> None:
    """Removing a mass removes its entry."""
    assert JobText(FULL).with_change(SetMass(0, 0.0)).job().span.masses == ()


@dataclass(frozen=True)
class Written:
    """A change as the command line writes it."""

    json: Mapping[str, object]
    kind: str = "mass"

    def as_json(self) -> Mapping[str, object]:
        return self.json

    def apply(self, span: Span) -> Span:
        return span


def test_all_parts_of_a_change_are_made() -> None:
    """Indexes count in the job as it was: removals come last."""
    text = JobText(FULL).with_new("mass", {"at": "1 m", "mass": "3 kg"})
    change = Written(
        {
            "all_of": [
                {"set_mass": {"index": 0, "mass_kg": 0}},
                {"move_mass": {"index": 1, "to_m": 3.0}},
                {"add_mass": {"at_m": 2.0, "mass_kg": 5.0}},
            ]
        }
    )
    masses = text.with_change(change).job().span.masses
    assert [(mass.at_m, mass.mass_kg) for mass in masses] == [(3.0, 3.0), (2.0, 5.0)]


def test_a_change_of_speed_goes_to_its_excitation() -> None:
    """By name or by number."""
    for told in ("pump", 0):
        change = Written(
            {"change_speed": {"excitation": told, "low_rpm": 1300, "high_rpm": 1350.5}}
        )
        speed = JobText(FULL).with_change(change).job().excitations[0].speed_hz
        assert speed == (pytest.approx(1300 / 60), pytest.approx(1350.5 / 60))
    missing = Written({"change_speed": {"excitation": "fan", "low_rpm": 1, "high_rpm": 2}})
    with pytest.raises(InputError, match="no excitation 'fan'"):
        JobText(FULL).with_change(missing)


def test_what_a_job_file_cannot_hold_is_refused() -> None:
    """An absorber has no table in the job file; the user is told what to do instead."""
    with pytest.raises(Refusal, match="cannot hold this change"):
        JobText(FULL).with_change(Written({"add_absorber": {"at_m": 2.0, "mass_kg": 3.0}}))
