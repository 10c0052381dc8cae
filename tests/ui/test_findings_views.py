"""Verdict, severity, further blows and doubts in the views."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fieldkit.signal.spectrum import SAMPLE_UNITS
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.widgets.interval_bar import CELLS, interval_bar
from tests.ui import glycol
from tests.ui.driving import SIZES, opened, rows_of, settled, text_of


@pytest.mark.parametrize("size", SIZES)
async def test_the_running_view_gives_each_strong_line_its_verdict(
    app: FieldkitApp, size: tuple[int, int]
) -> None:
    """49.1 Hz lies beyond 10 and 20 % of every made-up mode but one."""
    async with opened(app, size) as pilot:
        await pilot.press("2")
        await settled(pilot)
        verdicts = {row[0]: row[3] for row in rows_of(app, "#lines")}
        assert verdicts["49.10"] == "forced"
        assert set(verdicts.values()) <= {"resonance", "near", "forced", "cannot tell", "–"}
        said = text_of(app, "#running-text")
        assert "Severity, screening only: above ASME OM part 3 style velocity" in said


async def test_l_shows_every_verdict_and_every_criterion_with_its_source(
    app: FieldkitApp,
) -> None:
    """49.1 Hz at 3.2 m/s^2 rms is 10.37 mm/s rms: 3.2 / (2 pi 49.1)."""
    async with opened(app) as pilot:
        await pilot.press("2", "l")
        await pilot.pause()
        assert isinstance(app.screen, TextScreen)
        text = " ".join(app.screen.text.split())
        assert "49.1 Hz sits on pump 2x" in text
        assert "figures from memory" in text
        assert "the responsible piping engineer decides" in text


async def test_a_level_that_is_not_known_is_not_screened(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """And the view says what to state."""
    whole = glycol.running_reading()
    unknown = replace(whole.picture, velocity_rms_m_per_s=None)
    samples = replace(unknown, spectrum=replace(unknown.spectrum, unit=SAMPLE_UNITS))
    monkeypatch.setattr(glycol, "running_reading", lambda: replace(whole, picture=samples))
    async with opened(app) as pilot:
        await pilot.press("2")
        await settled(pilot)
        said = text_of(app, "#running-text")
        assert "Severity not screened: its level is not calibrated; state the sensitivity" in said


async def test_the_detune_view_begins_with_the_verdict(app: FieldkitApp) -> None:
    """Before the chance, and in one line of an 80-column terminal."""
    async with opened(app) as pilot:
        await pilot.press("5")
        await settled(pilot)
        first, second = text_of(app, "#question").splitlines()[:2]
        assert first.split(":")[0] in ("Resonance", "Near resonance", "Forced", "Cannot tell")
        assert len(first) <= 79
        assert second.startswith("Now: ")


async def test_the_match_view_shows_doubts_as_bars_and_what_contradicts(app: FieldkitApp) -> None:
    """Before as a line with ends, after as a shade with its median."""
    async with opened(app, (120, 40)) as pilot:
        await pilot.press("4")
        await settled(pilot)
        bars = [row[2] for row in rows_of(app, "#parameters")]
        assert all(len(bar) == CELLS and "█" in bar for bar in bars)
        assert any("▓" in bar and bar[0] == "├" and bar[-1] == "┤" for bar in bars)
        assert "belongs to no computed mode" in text_of(app, "#match-text")
        assert "Check: " in text_of(app, "#match-text")


def test_a_bar_is_logarithmic_over_decades() -> None:
    """1e6 to 1e8 about 1e7: the middle of the axis is the middle in ln."""
    bar = interval_bar((1e6, 1e7, 1e8), (5e6, 1e7, 2e7), cells=21)
    assert bar == "├──────▓▓▓█▓▓▓──────┤"


def test_a_bar_is_linear_over_a_few_per_cent() -> None:
    assert interval_bar((0.98, 1.0, 1.02), (0.99, 1.0, 1.01), cells=9) == "├─▓▓█▓▓─┤"


def test_what_goes_beyond_the_doubt_before_is_seen_to() -> None:
    """The ends of the line stay where they were."""
    bar = interval_bar((1.0, 2.0, 4.0), (2.0, 8.0, 16.0), cells=9)
    assert bar == "├─▓▓┤▓█▓▓"


@given(st.lists(st.floats(1e-3, 1e9), min_size=6, max_size=6))
def test_a_bar_always_fills_its_cells(values: list[float]) -> None:
    """Whatever the doubts, also where they are the same number."""
    before, after = sorted(values[:3]), sorted(values[3:])
    bar = interval_bar(tuple(before), tuple(after))
    assert len(bar) == CELLS
    assert "█" in bar
