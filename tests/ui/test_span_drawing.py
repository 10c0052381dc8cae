"""The span is drawn to scale, from a side that shows it, with everything that hangs on it."""

import numpy as np
import pytest
from textual.app import App

from fieldkit.span.layout import Leg, PointMass, Span, Support
from fieldkit.span.materials import Material
from fieldkit.span.pipes import PipeSection
from fieldkit.ui.widgets import ShapeLine, SpanDrawing
from fieldkit.ui.widgets.projection import PLANES, best_plane, centre_line_points, fit
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.span_art import KIND_GLYPHS, Picture, draw_span

STEEL = Material("carbon steel", 7850.0, 0.3, ((293.15, 203e9),), 1.2e-5)
PIPE = PipeSection(0.0889, 0.00549)
BEND_M = 0.114


def span_of(*legs, supports=(), masses=()):
    made = tuple(
        Leg(direction, length, BEND_M if number else None)
        for number, (direction, length) in enumerate(legs)
    )
    return Span(PIPE, STEEL, made, supports, masses)


X, Y, Z = (1.0, 0.0, 0.0), (0.0, 1.0, 0.0), (0.0, 0.0, 1.0)
STRAIGHT = span_of((X, 8.0))
ELBOW = span_of(
    (X, 4.2),
    (Z, 2.1),
    supports=(Support(0.0, "anchor"), Support(3.0, "clamp"), Support(6.3, "nozzle")),
    masses=(PointMass(2.0, 24.0, "check valve"),),
)
RISER = span_of(
    (X, 1.5),
    (Z, 2.4),
    (Y, 2.4),
    supports=(
        Support(0.0, "anchor"),
        Support(2.3, "guide"),
        Support(4.8, "hanger"),
        Support(6.3, "clamp"),
    ),
    masses=(PointMass(4.35, 9.0, "flange pair"),),
)
SPATIAL = span_of((X, 3.0), (Y, 2.0), (Z, 2.5))


def wave(span, direction):
    station = np.linspace(0.0, span.length_m, 41)
    return ShapeLine(
        station, np.outer(np.sin(np.pi * station / span.length_m), direction), "mode 1"
    )


def picture(span, shape=None, plane=None, marked=None):
    return Picture(span, shape, lambda m: f"{m:g} m", lambda kg: f"{kg:g} kg", plane, marked)


def drawn(asked, columns=70, rows=18):
    canvas = Canvas(columns, rows)
    draw_span(canvas, asked)
    return canvas


def text_of(canvas):
    return "\n".join(canvas.lines())


@pytest.mark.parametrize(
    ("span", "motion", "expected"),
    [
        (STRAIGHT, None, "elevation x-z"),
        (STRAIGHT, Z, "elevation x-z"),
        (STRAIGHT, Y, "plan x-y"),
        (span_of((Y, 5.0)), Z, "elevation y-z"),
        (span_of((Z, 5.0)), Y, "elevation y-z"),
        (ELBOW, None, "elevation x-z"),
        (ELBOW, Z, "elevation x-z"),
        (ELBOW, Y, "isometric"),
        (SPATIAL, None, "isometric"),
        (span_of((X, 3.0), (Y, 2.0)), None, "plan x-y"),
    ],
)
def test_the_side_that_shows_pipe_and_motion_is_chosen(span, motion, expected):
    stations, points = centre_line_points(span)
    shape = np.outer(np.sin(stations + 0.3), motion) if motion else None
    assert best_plane(points, shape).name == expected


def test_both_directions_have_one_scale():
    """A leg of 4.2 m and one of 2.1 m: twice as many dots."""
    canvas = drawn(picture(span_of((X, 4.2), (Z, 2.1)), plane=PLANES[0]))
    rows, columns = np.nonzero(canvas.dots[: 4 * 17])
    wide, high = columns.max() - columns.min(), rows.max() - rows.min()
    assert wide / high == pytest.approx(2.0, rel=0.05)


@pytest.mark.parametrize("plane", PLANES, ids=lambda plane: plane.name)
def test_everything_fits_between_the_margins(plane):
    _, points = centre_line_points(SPATIAL)
    flat = plane.project(points)
    dots = fit(flat, 10, 120, 8, 60).dots(flat)
    assert dots[:, 0].min() >= 10 - 1e-6
    assert dots[:, 0].max() <= 120 + 1e-6
    assert dots[:, 1].min() >= 8 - 1e-6
    assert dots[:, 1].max() <= 60 + 1e-6


def test_up_is_up_and_the_axes_are_told():
    canvas = drawn(picture(ELBOW))
    lines = canvas.lines()
    anchor = next(row for row, line in enumerate(lines) if KIND_GLYPHS["anchor"] in line)
    nozzle = next(row for row, line in enumerate(lines) if KIND_GLYPHS["nozzle"] in line)
    assert nozzle < anchor
    assert "elevation x-z" in lines[-1]
    assert "z↑ x→" in lines[-1]


def test_supports_masses_and_ends_are_named_with_their_station():
    text = text_of(drawn(picture(ELBOW)))
    for words in ("anchor 0 m", "clamp 3 m", "nozzle 6.3 m", "check valve 24 kg"):
        assert words in text
    assert "end 8 m" in text_of(drawn(picture(STRAIGHT)))


def test_every_kind_of_support_has_its_own_glyph():
    assert len(set(KIND_GLYPHS.values())) == len(KIND_GLYPHS)


def test_what_stands_below_or_hangs_above_is_drawn_there():
    span = span_of((X, 8.0), supports=(Support(2.0, "rest"), Support(6.0, "hanger")))
    lines = drawn(picture(span)).lines()
    pipe = next(
        row
        for row, line in enumerate(lines)
        if line.count("⠤") + line.count("⠒") + line.count("⠉") + line.count("⣀") > 20
    )
    assert "▲" in lines[pipe + 1]
    assert "┬" in lines[pipe - 1]


def test_the_mode_shape_departs_where_it_moves_and_rests_at_its_ends():
    bare = drawn(picture(STRAIGHT)).dots[: 4 * 17]
    moved = drawn(picture(STRAIGHT, wave(STRAIGHT, Z))).dots[: 4 * 17] & ~bare
    rows, columns = np.nonzero(moved)
    pipe_row = np.nonzero(bare)[0].min()
    middle = rows[np.abs(columns - 70) < 8]
    ends = rows[np.abs(columns - 70) > 45]
    assert pipe_row - middle.min() >= 8
    assert np.all(pipe_row - ends <= 5)


def test_a_shape_of_zeros_or_nan_is_left_out():
    station = np.array([0.0, 8.0])
    for value in (0.0, np.nan):
        shape = ShapeLine(station, np.full((2, 3), value))
        drawn(picture(STRAIGHT, shape, PLANES[0]))


def test_the_chosen_station_is_pointed_at_even_where_a_mass_stands():
    text = text_of(drawn(picture(ELBOW, marked=(2.0, "new support"))))
    assert "◎" in text
    assert "●" in text
    assert "new support 2 m" in text
    assert "check valve" in text


def test_the_scale_bar_is_as_long_as_it_says():
    canvas = drawn(picture(STRAIGHT, plane=PLANES[0]))
    line = canvas.lines()[-1]
    start, end = line.index("├"), line.index("┤")
    _, columns = np.nonzero(canvas.dots)
    dots_per_m = (columns.max() - columns.min()) / 8.0
    said_m = float(line[end + 1 :].split()[0])
    assert 2 * (end - start + 1) / dots_per_m == pytest.approx(said_m, rel=0.1)


@pytest.mark.parametrize("columns", [0, 1, 2, 10, 23, 30])
@pytest.mark.parametrize("rows", [0, 1, 2, 5, 8])
def test_no_size_is_too_small(columns, rows):
    for span in (STRAIGHT, ELBOW, SPATIAL):
        if columns and rows:
            canvas = drawn(picture(span, wave(span, Y), marked=(1.0, "new")), columns, rows)
            assert [len(line) for line in canvas.lines()] == [columns] * rows


def test_a_small_drawing_still_shows_supports():
    text = text_of(drawn(picture(ELBOW), 30, 8))
    assert KIND_GLYPHS["anchor"] in text
    assert KIND_GLYPHS["clamp"] in text
    assert "anchor" in text


def pipe_share(span, columns, rows):
    """The share of the canvas that the pipe takes, wide or high, the larger of the two."""
    canvas = drawn(picture(span, marked=(2.0, "change 1")), columns, rows)
    down, across = np.nonzero(canvas.dots)
    return max((np.ptp(down) + 1) / canvas.dot_rows, (np.ptp(across) + 1) / canvas.dot_columns)


@pytest.mark.parametrize(("columns", "rows"), [(40, 7), (49, 6), (30, 8), (71, 9), (70, 18)])
@pytest.mark.parametrize("span", [RISER, ELBOW, STRAIGHT], ids=["riser", "elbow", "straight"])
def test_the_pipe_takes_most_of_the_pane_whatever_labels_want(span, columns, rows):
    assert pipe_share(span, columns, rows) >= 0.6


def test_a_small_pane_keeps_every_glyph_though_not_every_word():
    text = text_of(drawn(picture(RISER), 40, 7))
    for glyph in ("▓", "‖", "┬", "╫", "●"):
        assert glyph in text


@pytest.mark.parametrize(("columns", "rows"), [(24, 6), (40, 7), (49, 6), (71, 9), (70, 18)])
@pytest.mark.parametrize("at_m", [0.0, 1.6, 2.3, 4.43, 5.32, 6.3])
def test_the_chosen_station_keeps_every_letter_of_its_label(at_m, columns, rows):
    canvas = drawn(picture(RISER, wave(RISER, Y), marked=(at_m, "change 1")), columns, rows)
    inked = "".join(run.text for row in canvas.runs() for run in row if run.ink == "marked")
    whole = (f"change 1 {at_m:g} m", "change 1", f"{at_m:g} m")
    assert inked.replace("◎", "") in whole


@pytest.mark.parametrize(("columns", "rows"), [(40, 7), (49, 6), (71, 9)])
def test_no_label_stands_among_the_words_of_the_foot(columns, rows):
    for span in (RISER, ELBOW, STRAIGHT):
        foot = drawn(picture(span, marked=(2.0, "change 1")), columns, rows).runs()[-1]
        assert {run.ink for run in foot if run.text.strip()} == {"note"}


def test_a_chosen_station_without_words_is_told_by_its_place():
    canvas = drawn(picture(STRAIGHT, marked=(4.0, "")))
    inked = "".join(run.text for row in canvas.runs() for run in row if run.ink == "marked")
    assert inked.replace("◎", "") == "4 m"


def test_a_label_stands_nearer_to_its_own_glyph_than_to_another():
    """The flange pair hangs beside the hanger and above the guide, and is taken for neither."""
    for columns, rows in ((40, 7), (49, 6), (71, 9)):
        lines = drawn(picture(RISER), columns, rows).lines()
        said = next((row for row, line in enumerate(lines) if "flange pair" in line), None)
        mass = next(row for row, line in enumerate(lines) if "●" in line)
        assert said is None or abs(said - mass) <= 1


class Host(App):
    def compose(self):
        yield SpanDrawing()


async def test_v_turns_through_every_side():
    app = Host()
    async with app.run_test(size=(70, 18)) as pilot:
        drawing = app.query_one(SpanDrawing)
        drawing.show(ELBOW, wave(ELBOW, Z))
        drawing.focus()
        await pilot.pause()
        seen = []
        for _ in range(4):
            seen.append(drawing.render_line(17).text.split("  ")[0])
            await pilot.press("v")
        assert seen == ["elevation x-z", "elevation y-z", "plan x-y", "isometric"]
        drawing.show(SPATIAL)
        assert "isometric" in drawing.render_line(17).text


async def test_without_a_span_a_sentence_helps():
    app = Host()
    async with app.run_test(size=(50, 8)) as pilot:
        await pilot.press("v")
        drawing = app.query_one(SpanDrawing)
        assert "No span yet" in "".join(drawing.render_line(y).text for y in range(8))


async def test_names_from_a_file_are_plain_text():
    span = span_of((X, 8.0), masses=(PointMass(4.0, 10.0, "[red]\x1b[31mvalve[/]"),))
    app = Host()
    async with app.run_test(size=(70, 18)):
        drawing = app.query_one(SpanDrawing)
        drawing.show(span)
        text = "".join(drawing.render_line(y).text for y in range(18))
        assert "[red][31mvalve[/] 10 kg" in text
        assert "\x1b" not in text
