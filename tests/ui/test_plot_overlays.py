"""Several recordings over each other, the decay over a tap, and a plot that is dragged."""

from __future__ import annotations

import numpy as np
import pytest
from textual.app import App

from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.plots import decay_lines, mode_marks, overlaid
from fieldkit.ui.widgets import Curve, DecayLine, SpectrumPlot, TimePlot
from fieldkit.ui.widgets.raster import Canvas
from fieldkit.ui.widgets.spectrum_art import View, draw_spectrum
from fieldkit.ui.widgets.spectrum_data import SpectrumData
from fieldkit.ui.widgets.time_art import Trace, draw_trace
from fieldkit.ui.widgets.view_range import Axis
from tests.ui import glycol
from tests.ui.driving import opened, until
from tests.ui.test_snapshots import StillApp

FREQUENCY = np.linspace(0.0, 200.0, 801)


def test_curves_over_each_other_differ_by_letter_and_line():
    spectrum = glycol.tap_reading().spectrum
    curves = overlaid([(spectrum, "one"), (spectrum, "two"), (spectrum, "three")])
    assert [curve.letter for curve in curves] == ["A", "B", "C"]
    assert len({curve.role for curve in curves}) == 3


def test_each_letter_stands_on_its_curve_and_in_the_legend():
    flat = [
        Curve(FREQUENCY, np.full(801, height), name, role, letter)
        for height, name, role, letter in (
            (1.0, "high", "measured", "A"),
            (0.1, "low", "second", "B"),
        )
    ]
    canvas = Canvas(90, 16)
    draw_spectrum(canvas, SpectrumData(tuple(flat), (), (), "m/s²", 200.0), View(Axis(0.0, 200.0)))
    lines = canvas.lines()
    assert "A high" in lines[0]
    assert "B low" in lines[0]
    rows = {letter: [r for r, line in enumerate(lines[1:13]) if letter in line] for letter in "AB"}
    assert len(rows["A"]) == len(rows["B"]) == 1
    assert rows["A"] < rows["B"]


def test_labels_of_modes_tell_their_damping():
    assert [mark.label for mark in mode_marks(glycol.MODES)] == ["vert 1.1 %", "lat 1.4 %", "0.8 %"]


def test_the_envelope_lies_on_the_crests_of_usable_taps_only():
    """The made-up blows ring at 23.41 Hz with 1.1 %, 0.6 high at first."""
    samples, _ = glycol.decay()
    found = decay_lines(glycol.tap_reading(), samples, glycol.MODES[:1])
    assert len(found) == 3
    assert found[0].height == pytest.approx(0.6, rel=0.1)
    assert found[0].decay_per_s == pytest.approx(0.011 * 2 * np.pi * 23.41)
    assert "23.4 Hz, 1.1 %" in found[0].word
    assert decay_lines(glycol.tap_reading(), None, glycol.MODES) == ()


def test_the_envelope_is_drawn_above_and_below():
    trace = Trace.of(np.zeros(1000), 100.0, (), "", (DecayLine(2.0, 8.0, 0.5, 0.2, "decay"),))
    canvas = Canvas(60, 12)
    draw_trace(canvas, trace, Axis(0.0, 10.0), None)
    rows = np.flatnonzero(canvas.dots[:, 60:100].any(axis=1))
    assert "╌╌ decay" in canvas.lines()[0]
    assert rows.max() - rows.min() > 8


def test_a_stretch_is_scaled_to_its_own_height():
    """A small tap beside a large one is seen as well once it fills the view."""
    samples = np.concatenate([np.full(500, 1.0), np.full(500, 0.01)])
    trace = Trace.of(samples, 100.0)
    assert trace.largest_between(np.linspace(6.0, 9.0, 50)) == pytest.approx(0.01)
    assert trace.largest_between(np.linspace(0.0, 10.0, 50)) == 1.0


class Plotted(App[None]):
    def compose(self):
        yield SpectrumPlot()

    def on_mount(self):
        self.query_one(SpectrumPlot).show([Curve(FREQUENCY, np.ones(801))], up_to_hz=100.0)


async def test_dragging_moves_the_view_and_leaves_the_cursor():
    async with Plotted().run_test(size=(80, 20)) as pilot:
        plot = pilot.app.query_one(SpectrumPlot)
        before = plot.axis
        await pilot.mouse_down(SpectrumPlot, offset=(60, 8))
        await pilot.hover(SpectrumPlot, offset=(40, 8))
        await pilot.mouse_up(SpectrumPlot, offset=(40, 8))
        assert plot.axis.low > before.low
        assert plot.axis.high - plot.axis.low == pytest.approx(before.high - before.low)
        assert plot.cursor is None
        await pilot.click(SpectrumPlot, offset=(40, 8))
        assert plot.cursor is not None


async def test_the_blow_under_the_cursor_fills_the_plot():
    app = StillApp()
    async with app.run_test(size=(120, 40)) as pilot:
        await until(pilot, lambda: bool(app.desk.traces))
        await pilot.pause()
        plot = app.view("tap").query_one(TimePlot)
        assert plot.axis == plot.limits()
        table = app.view("tap").table("#blows")
        table.focus()
        await pilot.pause()
        await pilot.press("down", "down")
        await until(pilot, lambda: 4.0 < plot.axis.low < glycol.TAPS[1].at_s < plot.axis.high < 9.0)
        await pilot.press("up", "up")
        await until(pilot, lambda: plot.axis == plot.limits())


async def test_w_lays_every_recording_over_the_others(app: FieldkitApp):
    async with opened(app, (120, 40)) as pilot:
        await until(pilot, lambda: app.desk.workup is not None)
        plot = app.view("tap").query_one(SpectrumPlot)
        await pilot.press("w")
        assert [curve.letter for curve in plot.data.curves][:1] == ["A"]
        await pilot.press("w")
        assert plot.data.curves[0].letter == ""
