"""Work in threads: stopping it, results that come too late, and what could not be answered."""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

from fieldkit import workup as chain
from fieldkit.errors import Refusal
from fieldkit.job.document import Job
from fieldkit.job.store import JobText
from fieldkit.progress import Progress
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.desk import StepState
from fieldkit.ui.dialogs import TextScreen
from fieldkit.ui.strip import Step
from tests.ui import glycol
from tests.ui.driving import change_something, opened, rows_of, said, settled, text_of, until
from tests.ui.job_text import JOB_TEXT


class Slow:
    """A chain that waits at its second step until it is let go."""

    def __init__(self) -> None:
        self.started = threading.Event()
        self.go = threading.Event()

    def __call__(self, job: Job, progress: Progress, _on_part: object) -> chain.Workup:
        progress.step("tap", 0.1)
        self.started.set()
        self.go.wait(20)
        progress.step("match", 0.6)
        return glycol.workup(job)


async def test_escape_stops_the_work_and_says_so(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    slow = Slow()
    monkeypatch.setattr(chain, "run", slow)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, slow.started.is_set)
        await until(pilot, lambda: "esc stops" in text_of(app, "#activity"))
        assert app.query_one("#step-match", Step).state is StepState.WORKING
        app.query_one("#tap-spectrum").focus()
        await pilot.press("escape")
        slow.go.set()
        await until(pilot, lambda: app.desk.stopped)
        assert app.desk.workup is None
        assert app.query_one("#step-match", Step).state is StepState.STOPPED
        assert text_of(app, "#activity") == ""


async def test_a_result_that_comes_too_late_is_dropped(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """An edit while the chain runs: only the result for the edited job is shown."""
    slow = Slow()
    monkeypatch.setattr(chain, "run", slow)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, slow.started.is_set)
        monkeypatch.setattr(chain, "run", lambda job, *_: glycol.workup(job))
        await change_something(pilot)
        slow.go.set()
        await until(pilot, lambda: app.desk.workup is not None)
        await settled(pilot)
        assert app.desk.workup is not None
        assert app.desk.workup.job.title == "Another title"


async def test_escape_closes_a_window_and_leaves_the_work_alone(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    slow = Slow()
    monkeypatch.setattr(chain, "run", slow)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, slow.started.is_set)
        await pilot.press("question_mark")
        await pilot.pause()
        await pilot.press("escape")
        await pilot.pause()
        assert not isinstance(app.screen, TextScreen)
        slow.go.set()
        await until(pilot, lambda: app.desk.workup is not None)
        await settled(pilot)


async def test_a_fault_in_the_chain_is_a_sentence_not_a_traceback(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(_job: Job, _progress: Progress, _on_part: object) -> chain.Workup:
        raise ZeroDivisionError("oh")

    monkeypatch.setattr(chain, "run", broken)
    async with opened(app):
        assert "ZeroDivisionError" in said(app)[-1]
        assert not app.desk.working


async def test_a_refused_span_shows_why_in_its_view(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    def buckled(_job: Job, _progress: Progress) -> tuple[chain.StateModes, ...]:
        raise Refusal("this span buckles", "check the temperature")

    monkeypatch.setattr(chain, "state_modes", buckled)
    async with opened(app) as pilot:
        await pilot.press("3")
        await pilot.pause()
        assert "This span buckles; check the temperature." in text_of(app, "#handbook")
        assert app.query_one("#step-span", Step).state is StepState.REFUSED


async def test_a_refused_match_shows_why_in_its_view(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    refused = (
        chain.StepRefusal("match", "no plausible support explains 23 Hz; check the pipe size"),
    )
    monkeypatch.setattr(
        chain, "run", lambda job, *_: glycol.workup(job, match=None, refused=refused)
    )
    async with opened(app) as pilot:
        await pilot.press("4")
        await pilot.pause()
        assert "No plausible support explains 23 Hz" in text_of(app, "#match-text")
        assert app.query_one("#step-match", Step).state is StepState.REFUSED


async def test_without_recordings_the_span_and_the_cure_still_answer(
    tmp_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    text = JobText(JOB_TEXT).without("recording", 1).without("recording", 0)
    path = tmp_path / "job.toml"
    text.save(path)
    monkeypatch.setattr(chain, "run", lambda job, *_: glycol.workup(job, match=None))
    app = FieldkitApp(path)
    async with opened(app) as pilot:
        assert app.query_one("#step-tap", Step).state is StepState.TO_DO
        assert app.query_one("#step-detune", Step).state is StepState.DONE
        assert "Nothing tapped yet" in text_of(app, "#reading")
        await pilot.press("5")
        await settled(pilot)
        assert len(rows_of(app, "#fixes")) == 3


async def test_each_step_is_shown_as_soon_as_it_is_done(
    app: FieldkitApp, monkeypatch: pytest.MonkeyPatch
) -> None:
    """While the match still runs the taps are there and their step says done."""
    go = threading.Event()

    def step_by_step(job: Job, progress: Progress, on_part: Callable[[chain.Workup], object]):
        whole = glycol.workup(job)
        on_part(replace(whole, match=None, detuning=None, done=("tap", "running", "span")))
        go.wait(20)
        return whole

    monkeypatch.setattr(chain, "run", step_by_step)
    async with app.run_test(size=(80, 24)) as pilot:
        await until(pilot, lambda: app.desk.fresh != ())
        await pilot.pause()
        assert app.query_one("#step-tap", Step).state is StepState.DONE
        assert app.query_one("#step-match", Step).state is StepState.WORKING
        assert rows_of(app, "#modes")
        go.set()
        await settled(pilot)
        assert app.query_one("#step-match", Step).state is StepState.DONE
