"""How long the screen makes people wait beside a bare app: ``python -m tests.bench.screen``.

Drawing is measured in processor time; from a key to the screen it is the clock that counts, with
the bare app asked the same before and after.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import asyncio
from collections.abc import Callable, Sequence
from pathlib import Path
from statistics import median
from time import perf_counter, process_time

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
from tests.bench.asking import parser
from tests.bench.rows import BY_CLOCK, Growth, Row, lines, table
from tests.ui.glycol import FIXES

SIZE = (120, 40)
POINTS = 48_000
BARE = "a bare Textual app"
NOTHING_RUNNING = f"key to screen of {BARE}, nothing running"
DRAWING, WAITING = "ms of processor", "ms " + BY_CLOCK


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

    def __init__(self, points: int) -> None:
        super().__init__()
        frequency = np.linspace(0.0, 2000.0, points)
        noise = np.random.default_rng(1).exponential(1.0, points)
        peaks = sum(1 / np.abs(1 - (frequency / f) ** 2 + 0.02j) for f in (230.0, 410.0, 1300.0))
        self.curve = Curve(frequency, noise + peaks, "made")

    def compose(self) -> ComposeResult:
        """The plot."""
        yield SpectrumPlot()

    def on_mount(self) -> None:
        """Noise with three peaks."""
        self.again()

    def again(self) -> None:
        """The spectrum handed over as if it had just been made."""
        marks = [Mark(f, "lat 1 %") for f in (230.0, 410.0, 1300.0)]
        self.query_one(SpectrumPlot).show([self.curve], marks)


def drawn_ms(widget: Widget, again: Callable[[], object], times: int) -> float:
    """Median processor time of all lines of a widget after a change."""
    took = []
    for _ in range(times):
        start = process_time()
        again()
        widget.render_lines(widget.size.region)
        took.append(process_time() - start)
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


async def bare_drawn(times: int) -> float:
    """Redraw of the bare app."""
    app = Bare()
    async with app.run_test(size=SIZE) as pilot:
        await pilot.pause()
        return drawn_ms(app.query_one(Static), app.action_step, times)


async def bare_keys(times: int) -> list[float]:
    """Key to screen of the bare app."""
    app = Bare()
    async with app.run_test(size=SIZE) as pilot:
        await pilot.pause()
        return await key_ms(app, "right", times, lambda: app.count)


async def spectrum(times: int, points: int) -> float:
    """Redraw of a spectrum over the whole screen."""
    app = Plotted(points)
    async with app.run_test(size=SIZE) as pilot:
        await pilot.pause()
        return drawn_ms(app.query_one(SpectrumPlot), app.again, times)


async def what_if(job_file: Path, times: int) -> list[float]:
    """Key to screen of steps along a curve."""
    job = load_job(job_file)
    change = AddSupport(0.4 * job.span.length_m, 4e6, 4e6)
    search = curve_search(job, None)
    found = curve_of(job, search, change, "place")
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
        return await key_ms(app, "right", steps, lambda: screen.at)


async def busy(job_file: Path, times: int) -> list[float]:
    """Key to screen in the Span view while the job is worked out."""
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
        return took


def rows(job_file: Path, times: int, runs: int) -> list[Row]:
    """Redraw, what-if step, and key to screen under a running workup."""
    redraws = [_redraws(times, POINTS) for _ in range(runs)]
    idle = [asyncio.run(bare_keys(times))]
    stepping = asyncio.run(what_if(job_file, times))
    idle.append(asyncio.run(bare_keys(times)))
    working = asyncio.run(busy(job_file, times))
    idle.append(asyncio.run(bare_keys(times)))
    return [
        _drawn(f"redraw of a spectrum of {POINTS:,} points, {SIZE[0]}x{SIZE[1]}", redraws),
        _key("what-if step along a fix curve, key to screen", stepping, idle[0] + idle[1]),
        _key("key to screen while a workup runs", working, idle[1] + idle[2]),
    ]


def growth(points: Sequence[int], times: int) -> list[Row]:
    """Redraw against the points of the spectrum."""
    ours, theirs = np.array([_redraws(times, count) for count in points]).T
    against = f"redraw of {BARE}"
    return Growth("redraw of a spectrum", points, "points", ours, theirs, against, DRAWING).rows()


def _redraws(times: int, points: int) -> tuple[float, float]:
    """Of the spectrum and of the bare app."""
    return asyncio.run(spectrum(times, points)), asyncio.run(bare_drawn(times))


def _drawn(name: str, pairs: Sequence[tuple[float, float]]) -> Row:
    ours, theirs = np.array(pairs).T
    medians = float(np.median(ours)), float(np.median(theirs))
    ratio = float(np.median(ours / theirs))
    return Row(name, *medians, ratio, f"redraw of {BARE} full of text", DRAWING)


def _key(name: str, ours: Sequence[float], theirs: Sequence[float]) -> Row:
    own, bare = median(ours), median(theirs)
    note = f"worst {max(ours):.0f} and {max(theirs):.0f} ms"
    return Row(
        name, own, bare, own / bare, f"key to screen of {BARE}, nothing running", WAITING, note
    )


def main() -> None:
    """Print the table."""
    asked = parser("tests.bench.screen", __doc__, "job", "runs")
    asked.add_argument("--times", type=int, default=40, help="redraws and keys")
    given = asked.parse_args()
    print(table(lines("screen", rows(given.job, given.times, given.runs), busy=False)))


if __name__ == "__main__":
    main()
