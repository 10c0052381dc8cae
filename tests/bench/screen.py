"""How long the screen makes people wait, beside a bare Textual app: medians and ratios.

Usage: python -m tests.bench.screen [--job samples/riser/job.toml] [--times 40]
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import argparse
import asyncio
from collections.abc import Callable
from pathlib import Path
from statistics import median
from time import perf_counter

import numpy as np
from textual.app import App, ComposeResult
from textual.widget import Widget
from textual.widgets import Static

from fieldkit.detune.fixes import AddSupport
from fieldkit.job.schema import load_job
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.curve_screen import CurveScreen
from fieldkit.ui.views.span import SpanView
from fieldkit.ui.widgets import Curve, Mark, SpectrumPlot
from fieldkit.ui.widgets.curve_plot import CurvePlot
from fieldkit.workup.curves import curve_of, curve_search
from tests.ui.glycol import FIXES

SIZE = (120, 40)
POINTS = 48_000


class Bare(App[None]):
    """One text that fills the screen and changes at a key."""

    BINDINGS = [("right", "step", "Step")]  # noqa: RUF012
    count = 0

    def compose(self) -> ComposeResult:
        """The text."""
        yield Static(self.text())

    def text(self) -> str:
        """As many characters as there are cells."""
        return "\n".join(f"{self.count:4d}" + "x" * (SIZE[0] - 4) for _ in range(SIZE[1]))

    def action_step(self) -> None:
        """Another text."""
        self.count += 1
        self.query_one(Static).update(self.text())


class Plotted(App[None]):
    """A spectrum of many points."""

    def compose(self) -> ComposeResult:
        """The plot."""
        yield SpectrumPlot()

    def on_mount(self) -> None:
        """Noise with three peaks."""
        frequency = np.linspace(0.0, 2000.0, POINTS)
        noise = np.random.default_rng(1).exponential(1.0, POINTS)
        peaks = sum(1 / np.abs(1 - (frequency / f) ** 2 + 0.02j) for f in (230.0, 410.0, 1300.0))
        marks = [Mark(f, "lat 1 %") for f in (230.0, 410.0, 1300.0)]
        self.query_one(SpectrumPlot).show([Curve(frequency, noise + peaks, "made")], marks)


def drawn_ms(widget: Widget, again: Callable[[], object], times: int) -> float:
    """Median time of all lines of a widget after a change."""
    took = []
    for _ in range(times):
        start = perf_counter()
        again()
        widget.render_lines(widget.size.region)
        took.append(perf_counter() - start)
    return 1e3 * median(took)


async def key_ms(
    app: App[None], key: str, times: int, state: Callable[[], object], pause_s: float = 0.03
) -> list[float]:
    """From a key until what it changes, read by ``state``, has been drawn."""
    took = []
    for _ in range(times):
        await asyncio.sleep(pause_s)
        shown, before = asyncio.Event(), state()
        start = perf_counter()
        app.simulate_key(key)
        while state() == before:
            await asyncio.sleep(0)
        app.screen.call_after_refresh(shown.set)
        await shown.wait()
        took.append(1e3 * (perf_counter() - start))
    return took


async def bare(times: int) -> tuple[float, float]:
    """Redraw and key of the bare app."""
    app = Bare()
    async with app.run_test(size=SIZE) as pilot:
        await pilot.pause()
        text = app.query_one(Static)
        redraw = drawn_ms(text, app.action_step, times)
        return redraw, median(await key_ms(app, "right", times, lambda: app.count))


async def spectrum(times: int) -> float:
    """Redraw of the spectrum at the whole screen."""
    app = Plotted()
    async with app.run_test(size=SIZE) as pilot:
        await pilot.pause()
        plot = app.query_one(SpectrumPlot)
        return drawn_ms(plot, plot.redraw, times)


async def what_if(job_file: Path, times: int) -> tuple[float, float]:
    """Key to screen of one step along a curve, and the seconds it took to judge the curve."""
    job = load_job(job_file)
    change = AddSupport(0.4 * job.span.length_m, 4e6, 4e6)
    search = curve_search(job, None)
    start = perf_counter()
    found = curve_of(job, search, change, "place")
    judged_s = perf_counter() - start
    screen = CurveScreen(job, None, FIXES[0])
    screen.judge = lambda _kind: None  # type: ignore[assignment, method-assign, return-value]
    app = App[None]()
    async with app.run_test(size=SIZE) as pilot:
        await app.push_screen(screen)
        await pilot.pause()
        screen.take_curve(search, "place", found)
        await pilot.pause()
        assert screen.query_one(CurvePlot).data is not None
        screen.at, steps = 0, min(times, len(found.chance) - 1)
        return median(await key_ms(app, "right", steps, lambda: screen.at)), judged_s


async def busy(job_file: Path, times: int) -> tuple[float, float]:
    """Key to screen in the Span view while the job is worked out: median and worst."""
    app = FieldkitApp(job_file)
    async with app.run_test(size=SIZE) as pilot:
        while not app.desk.states:
            await pilot.pause(0.02)
        await pilot.press("3")
        span = app.view("span")
        assert isinstance(span, SpanView)
        took: list[float] = []
        while app.desk.working and len(took) < times:
            took += await key_ms(app, "right", 1, lambda: span.mode_number)
        app.stop_work()
        return median(took), max(took)


def main() -> None:
    """Print one line each."""
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--job", type=Path, default=Path("samples/riser/job.toml"))
    asked.add_argument("--times", type=int, default=40)
    given = asked.parse_args()
    redraw, key = asyncio.run(bare(given.times))
    drawn = asyncio.run(spectrum(given.times))
    step, judged_s = asyncio.run(what_if(given.job, given.times))
    under, worst = asyncio.run(busy(given.job, given.times))
    print(
        f"bare Textual app, {SIZE[0]}x{SIZE[1]}: redraw {redraw:.1f} ms, key to screen {key:.1f} ms"
    )
    print(f"redraw of a {POINTS}-point spectrum: {drawn:.1f} ms, {drawn / redraw:.1f} times")
    print(f"what-if step: {step:.1f} ms, {step / key:.1f} times (its curve {judged_s:.1f} s)")
    print(
        f"key to screen while a job is worked out: {under:.1f} ms, {under / key:.1f} times, "
        f"worst {worst:.0f} ms"
    )


if __name__ == "__main__":
    main()
