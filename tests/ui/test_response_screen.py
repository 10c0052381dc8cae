"""The frequency response over the Tap view: what it shows, and what it says where there is none."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from textual.widgets import Static

from fieldkit import workup as chain
from fieldkit.job.document import HammerEntry, Job
from fieldkit.progress import Progress
from fieldkit.signal.hammer import ForceSpectrum
from fieldkit.signal.response import FrequencyResponse
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.response_screen import ResponseScreen
from fieldkit.ui.widgets import SpectrumPlot
from fieldkit.workup.hammer import HammerReading
from tests.signal.made_blows import Vibrating, accelerance
from tests.ui import glycol
from tests.ui.driving import SIZES, opened, rows_of

MODES = (Vibrating(23.41, 0.011, 1 / 40),)
AT_HZ = np.arange(1, 1600) * 0.125


def hammer(*, blows: int = 3) -> HammerReading:
    """Three blows on one mode, force usable to 150 Hz."""
    exact = accelerance(MODES, AT_HZ)
    response = FrequencyResponse(
        frequency_hz=AT_HZ,
        h1=exact,
        h2=exact,
        coherence=np.full(len(AT_HZ), 0.97) if blows > 1 else None,
        force_power=np.ones(len(AT_HZ)),
        quantity="accelerance",
        unit="(m/s^2)/N",
        blows=blows,
        rings_s=(8.0,) * blows,
        shares=(1 / blows,) * blows,
    )
    force = ForceSpectrum(np.arange(0.0, 200.0), np.ones(200), 150.0)
    return HammerReading(response, force)


Struck = Callable[[HammerReading | None], None]


@pytest.fixture
def struck(monkeypatch: pytest.MonkeyPatch, quick: None) -> Struck:
    """Gives the made-up tap recording a hammer."""

    def give(found: HammerReading | None) -> None:
        def run(job: Job, progress: Progress, _on_part: object) -> chain.Workup:
            whole = glycol.workup(job)
            (reading,) = whole.taps
            entry = replace(reading.entry, hammer=HammerEntry(2, 434.0, reading.entry.at_m))
            return replace(whole, taps=(replace(reading, entry=entry, hammer=found),))

        monkeypatch.setattr(chain, "run", run)

    return give


@pytest.mark.parametrize("size", SIZES)
async def test_h_shows_magnitude_and_coherence(
    job_path: Path, struck: Struck, size: tuple[int, int]
) -> None:
    """Both plots, the fitted curve over the measured one, and every line inside the window."""
    struck(hammer())
    app = FieldkitApp(job_path)
    async with opened(app, size) as pilot:
        await pilot.press("1", "h")
        await pilot.pause()
        screen = app.screen
        assert isinstance(screen, ResponseScreen)
        magnitude, coherence = screen.query(SpectrumPlot)
        assert [curve.label for curve in magnitude.data.curves] == ["measured", "fitted"]
        measured, fitted = magnitude.data.curves
        inside = len(fitted.frequency_hz)
        near = np.abs(fitted.frequency_hz - 23.41) < 3
        assert fitted.frequency_hz[-1] <= 150
        assert fitted.amplitude[near] == pytest.approx(measured.amplitude[:inside][near], rel=0.01)
        assert [round(mark.frequency_hz, 1) for mark in magnitude.data.marks] == [23.4, 150.0]
        assert coherence.data.curves[0].amplitude.max() == pytest.approx(0.97)
        assert (magnitude.amplitude_log, coherence.amplitude_log) == (True, False)
        for part in screen.query(".response-window > *"):
            assert part.region.height > 0
            assert part.region.bottom < size[1]
        assert magnitude.region.height >= 6
        assert coherence.region.height >= 4
        assert magnitude.frame().left == coherence.frame().left
        await pilot.press("escape")
        await pilot.pause()
        assert len(app.screen_stack) == 1


async def test_the_two_plots_move_together(job_path: Path, struck: Struck) -> None:
    struck(hammer())
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        await pilot.press("1", "h")
        await pilot.pause()
        magnitude, coherence = app.screen.query(SpectrumPlot)
        whole = magnitude.axis
        await pilot.press("right_square_bracket", "plus", "plus")
        await pilot.pause()
        assert magnitude.cursor == pytest.approx(23.41)
        assert coherence.cursor == magnitude.cursor
        assert coherence.axis == magnitude.axis != whole
        coherence.focus()
        await pilot.press("0")
        await pilot.pause()
        assert coherence.axis == magnitude.axis == whole


async def test_masses_and_notes_are_told_below(job_path: Path, struck: Struck) -> None:
    struck(hammer())
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        await pilot.press("1", "h")
        await pilot.pause()
        words = str(app.screen.query_one("#response-words", Static).render())
        assert "23.41 Hz  coherence 0.970  effective mass 40 kg" in words
        assert "The force has fallen by 20 dB at 150 Hz, short of the 200 Hz looked at" in words
        title = str(app.screen.query_one(".window-title", Static).render())
        assert "accelerance in (m/s^2)/N, 3 blows, struck at the sensor" in title


async def test_one_blow_has_no_coherence_to_draw(job_path: Path, struck: Struck) -> None:
    struck(hammer(blows=1))
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        await pilot.press("1", "h", "plus")
        await pilot.pause()
        _, coherence = app.screen.query(SpectrumPlot)
        assert coherence.data.empty
        assert coherence.empty_sentence == "One blow only: coherence needs two or more"


@pytest.mark.parametrize(
    ("found", "sentence"),
    [
        (None, 'press e on the recording and type its number at "hammer channel"'),
        (HammerReading(None, None, "channel 2 shows no force at the blows"),
         "No frequency response: channel 2 shows no force at the blows."),
    ],
)  # fmt: skip
async def test_what_is_missing_is_said(
    job_path: Path, struck: Struck, found: HammerReading | None, sentence: str
) -> None:
    struck(found)
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        await pilot.press("1", "h")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        assert sentence in " ".join(app.screen.text.split())


async def test_nothing_read_is_said(job_path: Path, quick: None) -> None:
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        app.put(workup=None)
        await pilot.press("1", "h")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        assert app.screen.text.startswith("Nothing has been read yet")


async def test_a_recording_with_a_hammer_names_the_key(job_path: Path, struck: Struck) -> None:
    struck(hammer())
    app = FieldkitApp(job_path)
    async with opened(app) as pilot:
        await pilot.press("1")
        await pilot.pause()
        assert rows_of(app, "#blows")[0][1] == "3 of 5 usable, h response, 20.0 s"
