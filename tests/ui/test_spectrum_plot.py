"""Spectrum and recording: what is drawn is where it belongs, and every key does its work."""

from itertools import pairwise

import numpy as np
import pytest
from textual import events
from textual.app import App

from fieldkit.ui.widgets import BandShade, Curve, Mark, SpectrumPlot, TapMark, TimePlot
from fieldkit.ui.widgets.labels import Label, arrange
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.spectrum_art import View, draw_spectrum, plot_frame, read_cursor
from fieldkit.ui.widgets.spectrum_data import SpectrumData, highest_between
from fieldkit.ui.widgets.time_art import Trace, draw_trace
from fieldkit.ui.widgets.view_range import Axis

FREQUENCY = np.linspace(0.0, 400.0, 4001)


def resonances(*peaks):
    """Steady response of single masses on springs, (frequency, damping ratio) each."""
    total = np.full(len(FREQUENCY), 1e-4)
    for f0, zeta in peaks:
        r = FREQUENCY / f0
        total = total + 0.01 / np.abs(1 - r**2 + 2j * zeta * r)
    return total


DATA = SpectrumData(
    (Curve(FREQUENCY, resonances((23.4, 0.01), (127.0, 0.01)), "vertical"),),
    (
        Mark(23.4, "vertical"),
        Mark(127.0, "vertical"),
        Mark(50.0, "", "tone"),
        Mark(90.0, "", "refused"),
        Mark(25.0, "", "model"),
    ),
    (BandShade(48.3, 49.8, 38.7, 59.8, "pump 2x"),),
    "m/s²",
    200.0,
)
WHOLE = View(Axis(0.0, 200.0))


def picture(data=DATA, view=WHOLE, columns=100, rows=30):
    canvas = Canvas(columns, rows)
    draw_spectrum(canvas, data, view)
    return canvas


def test_a_peak_stands_under_its_mark():
    """The highest dots of the curve lie within a cell of the column the mark's glyph stands in."""
    canvas = picture()
    frame = plot_frame(DATA, WHOLE, 100, 30)
    inside = canvas.dots[4 * frame.top : 4 * frame.bottom, 2 * frame.left :]
    highest = np.where(inside.any(axis=0), inside.argmax(axis=0), 999)
    low_end = highest[: 2 * 30]
    assert abs(int(low_end.argmin()) // 2 + frame.left - frame.column(23.4)) <= 1
    assert any(line[frame.column(23.4)] == "▼" for line in canvas.lines()[: frame.top])


def test_marks_carry_their_number_and_a_glyph_per_kind():
    text = "\n".join(picture().lines())
    for expected in ("▼23.4 vertical", "▼127 vertical", "≈50.0", "×90.0", "△25.0"):
        assert expected in text


def test_a_band_shows_without_colour():
    """Hatched over the band to keep clear of, denser over the excitation, its name above."""
    canvas = picture()
    frame = plot_frame(DATA, WHOLE, 100, 30)
    row = canvas.lines()[frame.top]
    assert "▒" in row[frame.stretch(48.3, 49.8)]
    assert set(row[frame.stretch(38.7, 48.0)]) <= {"╱", "▒"}
    assert "╱" not in row[frame.stretch(62.0, 200.0)]
    assert "pump 2x" in canvas.lines()[frame.top - 1]


def test_axes_bear_numbers_and_units():
    lines = picture().lines()
    assert lines[-1].endswith("200 Hz")
    assert {"0", "20", "40", "180"} <= set(lines[-1].split())
    numbers = [line.split("┤")[0].strip() for line in lines if "┤" in line]
    assert {"0.1", "0.5", "0.01"} <= set(numbers)
    assert any(line.startswith("m/s²") for line in lines)


def test_linear_amplitude_starts_at_zero():
    lines = picture(view=View(Axis(0.0, 200.0), amplitude_log=False)).lines()
    numbers = [float(line.split("┤")[0]) for line in lines if "┤" in line]
    assert numbers == sorted(numbers, reverse=True)
    assert numbers[-1] == 0.0


def test_the_read_out_names_frequency_amplitude_mark_and_band():
    view = View(Axis(0.0, 200.0), cursor_hz=49.0)
    head = picture(view=view).lines()[0]
    assert "Hz" in head
    assert "m/s²" in head
    assert "in pump 2x" in head
    at_mode = picture(view=View(Axis(0.0, 200.0), cursor_hz=23.4)).lines()[0]
    assert "▼23.4 vertical" in at_mode


def test_the_cursor_reads_the_highest_line_of_its_dot_column():
    view = View(Axis(0.0, 400.0), cursor_hz=23.0)
    frame = plot_frame(DATA, view, 100, 30)
    width = 400.0 / (2 * frame.columns)
    frequency, amplitude = read_cursor(DATA, view, frame)
    inside = np.abs(FREQUENCY - 23.0) <= width / 2
    assert amplitude == pytest.approx(DATA.curves[0].amplitude[inside].max())
    assert abs(frequency - 23.0) <= width / 2


def test_reading_between_lines_interpolates_and_outside_says_nothing():
    curve = Curve(np.array([10.0, 20.0]), np.array([1.0, 3.0]))
    assert highest_between(curve, 14.9, 15.1) == (15.0, pytest.approx(2.0))
    assert highest_between(curve, 30.0, 31.0) is None
    assert highest_between(Curve(np.empty(0), np.empty(0)), 1.0, 2.0) is None


@pytest.mark.parametrize("columns", [0, 1, 2, 7, 19, 40])
@pytest.mark.parametrize("rows", [0, 1, 2, 3, 5, 8, 13])
def test_no_size_is_too_small(columns, rows):
    for view in (WHOLE, View(Axis(0.5, 200.0, log=True), False, 0.3, 77.0, True)):
        lines = picture(view=view, columns=columns, rows=rows).lines()
        assert [len(line) for line in lines] == [columns] * rows


@pytest.mark.parametrize(
    "amplitude", [np.zeros(5), np.full(5, np.nan), np.full(5, np.inf), np.full(5, 1e-300)]
)
@pytest.mark.parametrize("log", [True, False])
def test_odd_amplitudes_are_drawn_without_complaint(amplitude, log):
    data = SpectrumData((Curve(np.arange(5.0), amplitude),))
    picture(data, View(Axis(0.0, 4.0), amplitude_log=log))


@pytest.mark.parametrize("rows", [1, 2, 3])
def test_labels_never_touch_and_modes_come_first(rows):
    labels = [
        Label(column, "▼", (f"{column}.0 vertical", f"{column}.0"), "mode")
        for column in (3, 5, 9, 30, 31, 60, 79)
    ]
    placed = arrange(labels, rows, 80)
    for row in range(rows):
        taken = sorted((p.start, p.end) for p in placed if p.row == row)
        assert all(first[1] <= second[0] for first, second in pairwise(taken))
    assert all(p.start >= 0 and p.end <= 80 for p in placed)
    glyph_columns = [p.start + p.text.index("▼") for p in placed]
    assert glyph_columns == [p.label.column for p in placed]
    if rows == 3:
        assert {p.label.column for p in placed} == {3, 5, 9, 30, 31, 60, 79}
        assert all(len(p.text) > 1 for p in placed)


def test_two_labels_of_one_column_cost_the_others_no_words():
    labels = [Label(column, "×", ("2 clipped", "2"), "refused") for column in (5, 40, 40, 70)]
    texts = sorted(p.text for p in arrange(labels, 1, 80))
    assert texts == ["×2 clipped", "×2 clipped", "×2 clipped"]


class Host(App):
    """One plot, and every message it sends."""

    def __init__(self, plot):
        super().__init__()
        self.plot = plot
        self.heard = []

    def compose(self):
        yield self.plot

    def on_mount(self):
        self.plot.focus()

    def on_spectrum_plot_range_changed(self, message):
        self.heard.append(message)

    def on_spectrum_plot_cursor_moved(self, message):
        self.heard.append(message)

    def on_time_plot_tap_chosen(self, message):
        self.heard.append(message)


def shown():
    plot = SpectrumPlot()
    plot.show(DATA.curves, DATA.marks, DATA.bands, amplitude_unit="m/s²", up_to_hz=200.0)
    return plot


async def test_keys_zoom_pan_and_come_home():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        assert app.plot.axis == Axis(0.0, 200.0)
        await pilot.press("plus", "plus")
        assert app.plot.axis.high - app.plot.axis.low == pytest.approx(200 * 0.49)
        before = app.plot.axis
        await pilot.press("right")
        assert app.plot.axis.low == pytest.approx(before.low + 9.8)
        await pilot.press("0")
        assert app.plot.axis == Axis(0.0, 200.0)
        await pilot.press("minus", "minus", "minus")
        assert app.plot.axis == Axis(0.0, 400.0)


async def test_a_changed_range_is_told():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        await pilot.pause()
        app.heard.clear()
        await pilot.press("plus")
        await pilot.pause()
        told = [m for m in app.heard if isinstance(m, SpectrumPlot.RangeChanged)]
        assert (told[-1].low_hz, told[-1].high_hz) == (app.plot.axis.low, app.plot.axis.high)
        assert told[-1].control is app.plot
        await pilot.press("l", "f")
        await pilot.pause()
        told = [m for m in app.heard if isinstance(m, SpectrumPlot.RangeChanged)]
        assert (told[-1].amplitude_log, told[-1].frequency_log) == (False, True)


async def test_the_cursor_walks_jumps_to_marks_and_tells():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        await pilot.press("right_square_bracket")
        assert app.plot.cursor == 23.4
        await pilot.press("right_square_bracket")
        assert app.plot.cursor == 25.0
        await pilot.press("left_square_bracket", "full_stop")
        step = 200.0 / (2 * app.plot.frame().columns)
        assert app.plot.cursor == pytest.approx(23.4 + step)
        await pilot.press("shift+right")
        assert app.plot.cursor == pytest.approx(23.4 + 9 * step)
        await pilot.pause()
        told = [m for m in app.heard if isinstance(m, SpectrumPlot.CursorMoved)]
        assert told[-1].frequency_hz == app.plot.cursor
        assert told[-1].amplitude > 0
        await pilot.press("escape")
        assert app.plot.cursor is None


async def test_a_mark_out_of_view_is_brought_into_view():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        app.plot.axis = Axis(10.0, 30.0)
        app.plot.cursor = 90.5
        await pilot.press("right_square_bracket")
        assert app.plot.cursor == 127.0
        assert app.plot.axis.holds(127.0)


async def test_the_wheel_zooms_about_the_pointer():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        column = app.plot.frame().column(127.0)
        under = app.plot.frame().value_at(column)
        await pilot._post_mouse_events(
            [events.MouseScrollUp],
            app.plot,
            offset=(column, 12),
        )
        assert app.plot.axis.high - app.plot.axis.low == pytest.approx(140.0)
        assert app.plot.frame().value_at(column) == pytest.approx(under)
        await pilot.click(app.plot, offset=(column, 12))
        assert app.plot.cursor == pytest.approx(under)


async def test_a_log_axis_starts_above_zero_and_comes_back():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        await pilot.press("f")
        assert app.plot.axis.log
        assert app.plot.axis.low > 0
        await pilot.press("left", "minus", "plus", "f")
        assert not app.plot.axis.log


async def test_new_data_of_the_same_reach_keep_the_view_and_others_reset_it():
    app = Host(shown())
    async with app.run_test(size=(100, 30)) as pilot:
        await pilot.press("plus")
        there = app.plot.axis
        app.plot.show(DATA.curves, (), DATA.bands, amplitude_unit="m/s²", up_to_hz=200.0)
        assert app.plot.axis == there
        app.plot.show(DATA.curves, (), DATA.bands, up_to_hz=100.0)
        assert app.plot.axis == Axis(0.0, 100.0)


@pytest.mark.parametrize("plot", [SpectrumPlot, TimePlot])
async def test_without_data_a_sentence_helps(plot):
    app = Host(plot())
    async with app.run_test(size=(60, 10)) as pilot:
        await pilot.press(
            "plus", "minus", "left", "full_stop", "right_square_bracket", "0", "l", "f"
        )
        text = "".join(app.plot.render_line(y).text for y in range(10))
        assert "No " in text


async def test_markup_in_a_label_is_plain_text():
    plot = SpectrumPlot()
    plot.show([Curve(FREQUENCY, resonances((50.0, 0.01)), "[bold red]x[/]")], up_to_hz=200.0)
    app = Host(plot)
    async with app.run_test(size=(80, 20)):
        assert "[bold red]x[/]" in plot.render_line(0).text


@pytest.mark.parametrize("theme", ["textual-dark", "textual-light"])
async def test_every_line_fills_the_width_in_every_theme(theme):
    app = Host(shown())
    async with app.run_test(size=(80, 24)) as pilot:
        app.theme = theme
        await pilot.pause()
        strips = [app.plot.render_line(y) for y in range(24)]
        assert {strip.cell_length for strip in strips} == {80}
        assert {len(strip.text) for strip in strips} == {80}


RATE_HZ = 1000.0


def recording():
    t = np.arange(0, 10, 1 / RATE_HZ)
    decay = np.exp(-3 * (t - 2.0)) * np.sin(2 * np.pi * 23 * (t - 2.0))
    return np.where(t >= 2.0, decay, 0.0)


def test_the_envelope_of_a_recording_holds_every_sample():
    """Direct and through the overview of long recordings: extremes agree with the samples."""
    rng = np.random.default_rng(3)
    samples = rng.normal(size=100_000)
    trace = Trace.of(samples, RATE_HZ)
    for low_s, high_s, columns in ((0.0, 100.0, 50), (3.0, 3.9, 200), (99.0, 101.0, 20)):
        edges = np.linspace(low_s, high_s, columns + 1)
        low, high = trace.between(edges)
        inside = samples[int(low_s * RATE_HZ) : int(np.ceil(high_s * RATE_HZ))]
        assert np.nanmin(low) == inside.min()
        assert np.nanmax(high) == inside.max()


def test_taps_are_numbered_and_refused_ones_say_why():
    taps = (TapMark(1, 2.0), TapMark(2, 6.0, False, "clipped"))
    canvas = Canvas(80, 12)
    draw_trace(canvas, Trace.of(recording(), RATE_HZ, taps), Axis(0.0, 10.0), None)
    text = "\n".join(canvas.lines())
    assert "▼1" in text
    assert "×2 clipped" in text
    assert "1 of 2 taps usable" in text
    assert canvas.lines()[-1].endswith("10 s")


@pytest.mark.parametrize("samples", [np.empty(0), np.zeros(3), np.full(9, np.nan), np.array([1.0])])
@pytest.mark.parametrize(("columns", "rows"), [(0, 0), (1, 1), (3, 9), (60, 2), (60, 12)])
def test_odd_recordings_on_any_canvas(samples, columns, rows):
    canvas = Canvas(columns, rows)
    trace = Trace.of(samples, RATE_HZ, (TapMark(1, 0.0),))
    draw_trace(canvas, trace, Axis(0.0, max(trace.duration_s, 1e-6)), 0.0)
    assert [len(line) for line in canvas.lines()] == [columns] * rows


async def test_the_cursor_jumps_from_tap_to_tap():
    plot = TimePlot()
    taps = (TapMark(1, 2.0), TapMark(2, 6.0, False, "clipped"))
    plot.show(recording(), RATE_HZ, taps)
    app = Host(plot)
    async with app.run_test(size=(80, 12)) as pilot:
        await pilot.press("right_square_bracket", "right_square_bracket")
        await pilot.pause()
        assert plot.cursor == 6.0
        assert [m.tap.number for m in app.heard] == [1, 2]
        assert "not usable: clipped" in plot.render_line(0).text
