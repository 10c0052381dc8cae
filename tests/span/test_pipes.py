"""Pipes by size and schedule, however people write them."""

import pytest

from fieldkit.errors import InputError
from fieldkit.span.pipes import PipeSection, known_schedules, known_sizes, standard_pipe


@pytest.mark.parametrize(
    "size",
    ["NPS 1-1/2", "1-1/2", "1 1/2", "1.5", '1-1/2"', "1.5 in", "nps 1.5 inch", "DN 40", "dn40"],
)
def test_one_and_a_half_inch_in_every_spelling(size):
    """48.3 x 3.68 mm in schedule 40 (ASME B36.10M, from memory)."""
    pipe = standard_pipe(size, "40")
    assert (pipe.outside_diameter_m, pipe.wall_m) == (0.0483, 0.00368)
    assert pipe.label == "NPS 1-1/2 schedule 40"


@pytest.mark.parametrize("schedule", ["40", "sch 40", "Sch. 40", "SCHEDULE 40", "sch40", " 40 "])
def test_schedule_in_every_spelling(schedule):
    assert standard_pipe("3", schedule) == standard_pipe("NPS 3", "40")


def test_schedule_words():
    """STD, XS and the stainless ones; NPS 3 XXS is 15.24 mm thick (from memory)."""
    assert standard_pipe("3", "std").wall_m == 0.00549
    assert standard_pipe("3", "XXS").wall_m == 0.01524
    assert standard_pipe("3", "10s").wall_m == 0.00305


def test_an_unknown_schedule_names_those_of_the_size():
    with pytest.raises(InputError, match=r"NPS 3-1/2 does not exist in schedule '160'") as raised:
        standard_pipe("3-1/2", "160")
    assert raised.value.place.field == "pipe.schedule"
    assert "40, 80" in raised.value.remedy
    assert "160" not in raised.value.remedy


@pytest.mark.parametrize("size", ["7", "115 mm", "DN 81", "1 2", "1/0", "", "three", "0.089"])
def test_an_unknown_size_is_never_rounded_to_the_next(size):
    with pytest.raises(InputError, match="no standard pipe size") as raised:
        standard_pipe(size, "40")
    assert raised.value.place.field == "pipe.size"


def test_plastic_and_sewer_tables_are_out_of_reach():
    """The library behind also holds plastic pipes; a steel schedule is all this answers."""
    with pytest.raises(InputError, match="does not exist in schedule"):
        standard_pipe("3", "40D1527")


def test_choice_lists_hold_only_what_exists():
    for size in known_sizes():
        for schedule in known_schedules(size):
            assert standard_pipe(size, schedule).wall_m > 0
    assert "3" in known_sizes()


@pytest.mark.parametrize("wall", [0.0, -0.001, 0.0445, 0.1])
def test_an_impossible_wall_is_refused(wall):
    with pytest.raises(InputError, match="does not fit an outside diameter"):
        PipeSection(0.0889, wall)
