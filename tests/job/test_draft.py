"""A new job while it is described: its file, its span, and what it comes to when half known."""

from __future__ import annotations

import json
from dataclasses import asdict, replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.job.draft import (
    Draft,
    draft_from,
    draft_text,
    job_of,
    measured_size,
    measured_wall,
    span_of,
)
from fieldkit.job.machines import FIXED, MACHINES
from fieldkit.job.schema import parse_job
from fieldkit.job.syntax import read_table

PIPE = {"title": "Booster", "size": "4", "schedule": "40", "tapped": "drained"}
WHOLE = Draft(
    pipe=PIPE,
    goal={"margin": "20 %", "up_to": "120 Hz"},
    rows={
        "leg": (
            {"direction": "+x", "length": "20' 3\""},
            {"direction": "+z", "length": "2", "bend_radius": "200 mm"},
        ),
        "support": ({"at": "0", "kind": "anchor"}, {"at": "12 ft", "kind": "clamp"}),
        "mass": ({"name": "check valve", "at": "2 m", "mass": "50 lb", "tolerance": "10 %"},),
        "excitation": (
            {"machine": "centrifugal pump", "speed": "1450 to 1495 rpm", "count": "7"},
            {"machine": FIXED, "speed": "100 Hz", "name": "mains"},
        ),
    },
)


def test_the_answers_make_a_job_file_that_reads_as_they_were_meant() -> None:
    job = parse_job(draft_text(WHOLE))
    assert job.title == "Booster"
    assert job.span.pipe.label == "NPS 4 schedule 40"
    assert job.span.length_m == pytest.approx(20.25 * 0.3048 + 2)
    assert [support.kind for support in job.span.supports] == ["anchor", "clamp"]
    assert job.span.masses[0].mass_kg == pytest.approx(50 * 0.45359237)
    assert job.excitations[0].orders == (1, 2, 7)
    assert job.excitations[1].frequency_hz == (100.0, 100.0)
    assert job.tapped.fill == (0.0, 0.0)
    assert job.running.fill == (1.0, 1.0)
    assert job.goal.up_to_hz == 120.0


def test_the_file_tells_who_edits_it_where_its_orders_come_from() -> None:
    text = draft_text(WHOLE)
    assert "orders = [1, 2, 7]    # unbalance, misalignment, 7 vanes (common practice)" in text
    assert "Any quantity may be typed in any unit" in text
    assert 'size = "NPS 4"' in text


def test_orders_that_were_typed_stand_without_that_remark() -> None:
    row = {"machine": "fan", "speed": "900 rpm", "orders": "1, 3"}
    text = draft_text(replace(WHOLE, rows={**WHOLE.rows, "excitation": (row,)}))
    assert "orders = [1, 3]\n" in text


def test_a_measured_pipe_and_measured_contents_are_written_as_such() -> None:
    pipe = {"size": "88.9 mm", "schedule": "5.5 mm", "contents": "1045 kg/m^3"}
    span = job_of(Draft(pipe=pipe)).span
    assert span.pipe.outside_diameter_m == pytest.approx(0.0889)
    assert span.pipe.wall_m == pytest.approx(0.0055)
    assert span.contents_density_kg_per_m3 == pytest.approx(1045)


@pytest.mark.parametrize(
    ("typed", "size", "wall"),
    [("NPS 3", False, False), ("DN 80", False, False), ("2-1/2", False, False),
     ("88.9 mm", True, True), ("5.5mm", True, True), ("40", False, False), ("XS", False, False)],
)  # fmt: skip
def test_what_is_measured_is_told_from_what_is_named(typed: str, size: bool, wall: bool) -> None:
    assert measured_size(typed) is size or typed == "40"
    assert measured_wall(typed) is wall


def test_before_the_first_leg_there_is_no_span_and_before_the_first_support_none_is_drawn() -> None:
    assert span_of(Draft(pipe=PIPE)) is None
    bare = span_of(Draft(pipe=PIPE, rows={"leg": WHOLE.of("leg")}))
    assert bare is not None
    assert bare.supports == ()


def test_the_row_in_hand_is_drawn_as_soon_as_it_makes_sense() -> None:
    draft = Draft(pipe=PIPE, half={"leg": {"direction": "+y", "length": "3 m"}})
    span = span_of(draft.with_half("leg"))
    assert span is not None
    assert span.length_m == 3.0


def test_a_row_taken_up_again_is_drawn_in_its_place() -> None:
    draft = replace(WHOLE, half={"leg": {"direction": "+x", "length": "1 m"}}, at={"leg": 0})
    assert [row["length"] for row in draft.with_half("leg").of("leg")] == ["1 m", "2"]


def test_a_schedule_that_the_size_does_not_have_is_said_at_its_key() -> None:
    with pytest.raises(InputError) as caught:
        job_of(Draft(pipe={"size": "NPS 4", "schedule": "20"}))
    assert caught.value.place.field == "pipe.schedule"


def test_a_draft_survives_being_kept() -> None:
    assert draft_from(json.loads(json.dumps(asdict(WHOLE)))) == WHOLE


TYPED = st.text(st.characters(exclude_categories=["Cs"]), max_size=12)


@settings(max_examples=40, deadline=None)
@given(title=TYPED, size=TYPED, length=TYPED, kind=TYPED, speed=TYPED)
def test_whatever_is_typed_makes_toml_or_one_sentence(
    title: str, size: str, length: str, kind: str, speed: str
) -> None:
    """No answer can break out of its place in the file."""
    draft = Draft(
        pipe={**PIPE, "title": title, "size": size},
        rows={
            "leg": ({"direction": "+x", "length": length},),
            "support": ({"at": "0 m", "kind": kind},),
            "excitation": ({"machine": "fan", "speed": speed},),
        },
    )
    try:
        table = read_table(draft_text(draft), None)
    except InputError:
        return
    assert table["title"] == (title.strip() or "New job")
    assert set(table) <= {
        "fieldkit", "title", "units", "pipe", "contents", "state", "leg", "support",
        "excitation", "goal",
    }  # fmt: skip


@pytest.mark.parametrize("name", list(MACHINES))
def test_every_machine_has_orders_in_rising_order(name: str) -> None:
    machine = MACHINES[name]
    for count in (0, 5):
        orders = machine.orders(count)
        assert list(orders) == sorted(set(orders))
        assert bool(orders) is (name != FIXED)


def test_what_is_counted_brings_its_own_order() -> None:
    """Vane passing is the number of vanes a turn; a four-stroke fires half its cylinders a turn."""
    assert 7 in MACHINES["centrifugal pump"].orders(7)
    assert 3 in MACHINES["four-stroke engine"].orders(6)
    assert MACHINES["centrifugal pump"].orders(0) == (1, 2)
