"""Windows worked out in a thread: installation of a change, equal spacing."""

from __future__ import annotations

import pytest
from textual.widgets import Static

from fieldkit import workup as chain
from fieldkit.errors import Refusal
from fieldkit.job.document import Job
from fieldkit.progress import Progress
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.worked_screen import WorkedScreen
from tests.ui import glycol
from tests.ui.driving import SIZES, opened, settled


@pytest.fixture
def unmatched(monkeypatch: pytest.MonkeyPatch, quick: None) -> None:
    """The made-up workup without its made-up ensemble, which knows nothing of this span."""

    def run(job: Job, progress: Progress, _on_part: object) -> chain.Workup:
        return glycol.workup(job, match=None)

    monkeypatch.setattr(chain, "run", run)


def text_on(app: FieldkitApp) -> str:
    assert isinstance(app.screen, WorkedScreen)
    return str(app.screen.query_one("#worked-text", Static).render())


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("key", ["i", "enter"])
async def test_a_change_tells_what_it_takes(app, unmatched, size, key):
    async with opened(app, size) as pilot:
        await pilot.press("5")
        await pilot.press(key)
        await settled(pilot)
        told = text_on(app)
        assert "Draw it" in told
        assert "Brackets that have it" in told
        assert "EN 10056-1" in told
        assert "responsible piping engineer" in told
        rows = told.splitlines()
        assert max(len(r) for r in rows if "held" in r or "braced" in r) <= size[0] - 4
        await pilot.press("escape")
        assert not isinstance(app.screen, WorkedScreen)


@pytest.mark.parametrize("size", SIZES)
async def test_the_span_tells_how_far_apart_supports_may_stand(app, unmatched, size):
    async with opened(app, size) as pilot:
        await pilot.press("3")
        await pilot.press("p")
        await settled(pilot)
        told = text_on(app)
        assert "First natural frequency of 5 equal spans" in told
        assert "By weight" in told
        bars = [row for row in told.splitlines() if "█" in row]
        assert len(bars) > 10
        assert max(map(len, bars)) <= size[0] - 4
        await pilot.press("q")
        assert not isinstance(app.screen, WorkedScreen)


async def test_what_cannot_be_worked_out_is_one_sentence(app, unmatched):
    def refuse() -> list[str]:
        raise Refusal("the span falls down", "hold it up")

    def fail() -> list[str]:
        raise ZeroDivisionError("nothing by nothing")

    async with opened(app) as pilot:
        for answer, says in ((refuse, "falls down"), (fail, "ZeroDivisionError")):
            app.push_screen(WorkedScreen("Title", answer))
            await settled(pilot)
            assert says in text_on(app)
            await pilot.press("escape")
