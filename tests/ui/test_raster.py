"""The canvas: what is drawn is there, nothing falls over the edge, no text moves the cursor."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from rich.cells import cell_len

from fieldkit.ui.widgets.dots import clipped_segments, envelope
from fieldkit.ui.widgets.glyphs import PLAIN_BRAILLE
from fieldkit.ui.widgets.raster import Canvas


def test_each_dot_of_a_cell_is_its_braille_bit():
    """Unicode 15.1, block Braille Patterns: dots 1-8 are bits 0-7, numbered down the left, then the
    right column, the bottom row last."""
    numbered = [(0, 0), (0, 1), (0, 2), (1, 0), (1, 1), (1, 2), (0, 3), (1, 3)]
    for bit, (x, y) in enumerate(numbered):
        canvas = Canvas(1, 1)
        canvas.points([x], [y], "ink")
        assert canvas.lines() == [chr(0x2800 + (1 << bit))]


def test_rows_come_as_runs_of_equal_look():
    canvas = Canvas(6, 1)
    canvas.write(0, 0, "ab", "one")
    canvas.write(0, 2, "c", "two")
    canvas.ground(slice(0, 1), slice(2, 6), "floor")
    assert canvas.runs() == [[("ab", "one", ""), ("c", "two", "floor"), ("   ", "", "floor")]]


def test_text_stands_over_dots_and_dots_over_patterns():
    canvas = Canvas(3, 1)
    canvas.pattern(slice(0, 1), slice(0, 3), "╱", "hatch")
    canvas.polyline([2, 5], [0, 0], "line")
    canvas.write(0, 2, "x", "text")
    assert [(run.text, run.ink) for run in canvas.runs()[0]] == [
        ("╱", "hatch"),
        ("⠉", "line"),
        ("x", "text"),
    ]


def test_a_wide_character_takes_two_cells_and_is_never_cut():
    canvas = Canvas(3, 1)
    end = canvas.write(0, 0, "a漢字", "ink")
    assert canvas.lines() == ["a漢"]
    assert end == 5
    assert not canvas.free(0, 2, 3)


@pytest.mark.parametrize(
    ("column", "expected"), [(0, "x 字"), (1, " x字"), (2, "漢x "), (3, "漢 x")]
)
def test_text_over_half_a_wide_character_leaves_the_row_as_wide_as_it_was(column, expected):
    canvas = Canvas(4, 1)
    canvas.write(0, 0, "漢字", "ink")
    canvas.write(0, column, "x", "ink")
    assert canvas.lines() == [expected]


@pytest.mark.parametrize("text", ["\x1b[31mred", "a\nb\tc\r", "a\u200b\u202eb", "a\x00b\uffff"])
def test_no_character_that_moves_the_cursor_gets_through(text):
    canvas = Canvas(12, 1)
    canvas.write(0, 0, text, "ink")
    (line,) = canvas.lines()
    assert line.isprintable()
    assert cell_len(line) == 12


@given(
    st.lists(
        st.tuples(*(st.floats(allow_nan=True, allow_infinity=True, width=32),) * 2), max_size=6
    ),
    st.integers(0, 9),
    st.integers(0, 5),
)
@settings(max_examples=60, deadline=None)
def test_any_line_fits_any_canvas(points, columns, rows):
    """Every row is exactly as wide as the canvas, whatever the points."""
    canvas = Canvas(columns, rows)
    xy = np.array(points, dtype=float).reshape(-1, 2)
    canvas.polyline(xy[:, 0], xy[:, 1], "ink", dash=len(points) % 3)
    canvas.points(xy[:, 0], xy[:, 1], "ink")
    lines = canvas.lines()
    assert [len(line) for line in lines] == [columns] * rows


def test_a_line_is_drawn_without_gaps():
    """Every dot column between its ends holds a dot, next to the dots of its neighbours."""
    canvas = Canvas(20, 10)
    canvas.polyline([1, 38], [35, 4], "ink")
    rows = [np.flatnonzero(canvas.dots[:, column]) for column in range(1, 39)]
    assert all(len(row) for row in rows)
    assert all(abs(a[0] - b[0]) <= 1 for a, b in pairwise(rows))


def test_nan_breaks_a_line():
    canvas = Canvas(10, 1)
    canvas.polyline([0, 5, np.nan, 14, 19], [0, 0, 0, 0, 0], "ink")
    assert canvas.lines() == ["⠉⠉⠉    ⠉⠉⠉"]


def test_a_dashed_line_leaves_out_every_other_group():
    """Corners and short segments do not disturb the rhythm."""
    canvas = Canvas(8, 1)
    canvas.polyline(np.linspace(0, 15, 91), np.zeros(91), "ink", dash=2)
    assert canvas.lines() == ["⠉ ⠉ ⠉ ⠉ "]


def test_a_line_far_beyond_the_edge_costs_no_more_than_the_canvas():
    starts, ends = clipped_segments(np.array([[-1e12, 5.0], [1e12, 5.0]]), 40, 20)
    assert starts == pytest.approx(np.array([[-0.499, 5.0]]), abs=1e-3)
    assert ends == pytest.approx(np.array([[39.499, 5.0]]), abs=1e-3)


@given(
    st.lists(st.floats(-100, 100), min_size=2, max_size=40),
    st.integers(1, 30),
    st.floats(0.1, 60),
    st.floats(0.1, 60),
)
@settings(max_examples=60, deadline=None)
def test_the_envelope_of_a_piecewise_linear_curve_is_exact(values, columns, start, length):
    """Against the curve sampled at its own points and 200 times per column."""
    x = np.arange(len(values), dtype=float)
    y = np.array(values)
    edges = np.linspace(start, start + length, columns + 1) - 5.0
    low, high = envelope(x, y, edges)
    for i in range(columns):
        fine = np.linspace(edges[i], edges[i + 1], 200)
        fine = np.concatenate([fine, x[(x >= edges[i]) & (x < edges[i + 1])]])
        inside = fine[(fine >= x[0]) & (fine <= x[-1])]
        sampled = np.interp(inside, x, y)
        if len(sampled) and edges[i] >= x[0] and edges[i + 1] <= x[-1]:
            assert low[i] == pytest.approx(sampled.min(), abs=1e-6)
            assert high[i] == pytest.approx(sampled.max(), abs=1e-6)


def test_no_peak_is_lost_in_reduction():
    """A single line among 48,000 shows in its column, wherever it is."""
    frequency = np.linspace(0, 24000, 48000)
    for index in (0, 1, 17, 12345, 47998, 47999):
        amplitude = np.ones(48000)
        amplitude[index] = 100.0
        _, high = envelope(frequency, amplitude, np.linspace(0, 24000.001, 241))
        assert np.nanmax(high) == 100.0
        assert np.nanargmax(high) == min(239, int(frequency[index] / 100))


def test_nan_in_a_curve_leaves_its_columns_empty():
    x = np.arange(100.0)
    y = np.ones(100)
    y[40:60] = np.nan
    low, high = envelope(x, y, np.arange(0.0, 101.0, 5.0))
    assert np.isnan(low[8:11]).all()
    assert np.isfinite(high[:7]).all()
    assert np.isfinite(high[13:19]).all()


def test_plain_pictures_keep_to_ascii():
    canvas = Canvas(30, 4)
    canvas.pattern(slice(0, 4), slice(0, 30), "╱", "hatch")
    canvas.polyline([0, 50], [0, 15], "ink")
    canvas.write(0, 2, "▼23.4 Hz µ 漢", "ink")
    lines = canvas.lines(plain=True)
    assert all(line.isascii() and line.isprintable() for line in lines)
    assert "v23.4 Hz u" in lines[0]
    assert {len(line) for line in lines} == {30}


def test_every_braille_pattern_has_a_visible_stand_in():
    assert chr(PLAIN_BRAILLE[0]) == " "
    assert all(33 <= code < 127 for code in PLAIN_BRAILLE[1:])
