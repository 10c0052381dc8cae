"""The table of the benchmarks says what was measured, and keeps what was not."""

import numpy as np
import pytest

from tests.bench.__main__ import BENCHMARKS
from tests.bench.measuring import in_turn, ratio
from tests.bench.page import Measured, circumstances, renewed
from tests.bench.rows import BY_CLOCK, HEAD, Growth, Row, exponent, lines, number, table

PAINT = Row("first paint", 0.61, 0.34, 1.79, "a bare app", f"s {BY_CLOCK}")
COUNTED = Row("fixes", 5.71e6, 158.0, 36139.2, "a library", "a second", "17,591 tried")
ORDER = ("fixes", "start")


def cells(line: str) -> list[str]:
    return [cell.strip() for cell in line.strip("|").split("|")]


@pytest.mark.parametrize("power", [0.0, 0.5, 1.0, 2.3])
def test_exponent_of_a_power_law_is_its_power(power: float) -> None:
    sizes = np.array([2, 5, 10, 20, 40])
    assert exponent(sizes, 0.3 * sizes**power) == pytest.approx(power, abs=1e-12)


def test_exponent_of_uneven_costs_is_that_of_the_least_squares_line() -> None:
    """Slope by hand: logs (0, 1, 2) against (0, 1, 5) give sum(dx dy) / sum(dx^2) = 5 / 2."""
    assert exponent([1, 10, 100], [1, 10, 1e5]) == pytest.approx(2.5)


@pytest.mark.parametrize(
    ("sizes", "values"), [([4], [1.0]), ([4, 4], [1.0, 2.0]), ([1, 2], [0.0, 1.0])]
)
def test_no_exponent_without_two_sizes_and_positive_costs(
    sizes: list[float], values: list[float]
) -> None:
    with pytest.raises(ValueError, match="two different sizes"):
        exponent(sizes, values)


def test_growth_has_a_row_for_each_size_and_one_for_the_exponents() -> None:
    grown = Growth("workup", (2, 4, 8), "supports", (1, 2, 8), (1, 2, 4), "a solve", "s").rows()
    assert [row.name for row in grown[:2]] == ["workup: 2 supports", "workup: 4 supports"]
    assert [row.ratio for row in grown[:3]] == [1, 1, 2]
    last = grown[3]
    assert (last.ours, last.theirs, last.ratio) == pytest.approx((1.5, 1.0, 1.5))
    assert last.unit == "exponent"
    assert last.note == "2.00 between the two largest"


def test_exponents_have_no_ratio_where_the_other_cost_does_not_grow() -> None:
    grown = Growth("redraw", (10, 100), "points", (1, 2), (3, 3), "a bare app", "ms").rows()
    assert np.isnan(grown[-1].ratio)
    assert cells(lines("points", grown[-1:], busy=False)[0])[5] == "–"


@pytest.mark.parametrize(
    ("value", "said"),
    [
        (5.71e6, "5,710,000"),
        (36139.2, "36,100"),
        (158.4, "158"),
        (12.345, "12.3"),
        (1.0, "1.00"),
        (0.02364, "0.0236"),
        (0.0, "0"),
        (float("nan"), "–"),
    ],
)
def test_numbers_have_three_digits(value: float, said: str) -> None:
    assert number(value) == said


def test_a_line_holds_both_medians_the_ratio_and_what_it_is_against() -> None:
    (line,) = lines("fixes", [COUNTED], busy=True)
    against = "a library (17,591 tried)"
    said = ["fixes", "fixes", "5,710,000", "158", "a second", "36,100", against]
    assert cells(line) == said
    assert len(cells(line)) == len(HEAD)


def test_only_times_by_the_clock_are_marked_on_a_busy_machine() -> None:
    marked, unmarked = lines("start", [PAINT, COUNTED], busy=True)
    assert marked.endswith("a bare app (the machine was busy) |")
    assert "busy" not in unmarked
    assert "busy" not in lines("start", [PAINT], busy=False)[0]


def test_table_has_as_many_columns_in_every_line() -> None:
    text = table(lines("fixes", [COUNTED, PAINT], busy=False))
    assert {len(cells(line)) for line in text.splitlines()} == {len(HEAD)}


def test_renewing_one_benchmark_keeps_the_lines_of_the_others_in_order() -> None:
    start = Measured("start", ("| start | old |",), "| start | then |")
    fixes = Measured("fixes", ("| fixes | one |", "| fixes | two |"), "| fixes | then |")
    anew = Measured("start", ("| start | new |",), "| start | now |")
    page = ""
    for measured in (start, fixes, anew):
        page = renewed(page, measured, ORDER)
    figures, machine = page.split("## Measured on")
    body = [line for line in figures.splitlines() if line.startswith(("| fixes", "| start"))]
    assert body == ["| fixes | one |", "| fixes | two |", "| start | new |"]
    assert "| fixes | then |\n| start | now |" in machine
    assert renewed(page, anew, ORDER) == page


def test_the_machine_is_described_without_its_name() -> None:
    import platform

    said = circumstances("fixes", True, 9.96)
    assert "cores" in said
    assert f"Python {platform.python_version()}" in said
    assert "10.0 running or waiting" in said
    assert platform.node() not in said


def test_work_is_taken_in_turn_and_the_first_round_is_thrown_away() -> None:
    order: list[str] = []
    ticks = iter([0, 9, 9, 10, 10, 12, 12, 13, 13, 17, 17, 19])
    works = {name: lambda name=name: order.append(name) for name in ("ours", "theirs")}
    spent = in_turn(works, 2, lambda: float(next(ticks)))
    assert order == ["ours", "theirs"] * 3
    assert spent["ours"].tolist() == [2, 4]
    assert spent["theirs"].tolist() == [1, 2]
    assert ratio(spent["ours"], spent["theirs"]) == 2


def test_benchmarks_have_names_of_one_word() -> None:
    """A line is found again by the name it starts with."""
    assert all(name.isidentifier() for name in BENCHMARKS)
