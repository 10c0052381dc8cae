"""Drive the app by keys and read its screens, for the tests."""

from __future__ import annotations

from collections.abc import AsyncIterator, Callable
from contextlib import asynccontextmanager

from textual.pilot import Pilot
from textual.widgets import Input, Static

from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.forms.window import FieldRow
from fieldkit.ui.table import Table

SIZES = [(80, 24), (120, 40)]


@asynccontextmanager
async def opened(app: FieldkitApp, size: tuple[int, int] = (80, 24)) -> AsyncIterator[Pilot[None]]:
    """The app with its job read and worked out."""
    async with app.run_test(size=size) as pilot:
        await settled(pilot)
        yield pilot


async def settled(pilot: Pilot[None]) -> None:
    """Every thread done and every message of it handled."""
    app = pilot.app
    for _ in range(4):
        await pilot.pause()
        threads = [w for w in app.workers if w._thread_worker and not w.is_finished]
        if wanted := [worker for worker in threads if not worker.is_cancelled]:
            await app.workers.wait_for_complete(wanted)
    await pilot.pause()


async def fill(pilot: Pilot[None], **texts: str) -> None:
    """Type into the fields of the form on screen."""
    for row in pilot.app.screen.query(FieldRow):
        if row.field.key in texts:
            row.query_one(Input).value = texts[row.field.key]
    await pilot.pause()


def text_of(app: FieldkitApp, selector: str) -> str:
    return str(app.screen_stack[0].query_one(selector, Static).render())


def rows_of(app: FieldkitApp, selector: str) -> list[list[str]]:
    table = app.screen_stack[0].query_one(selector, Table)
    return [[cell.plain for cell in table.get_row_at(i)] for i in range(table.row_count)]


def said(app: FieldkitApp) -> list[str]:
    return [notification.message for notification in app._notifications]


async def choose_row(pilot: Pilot[None], key: str) -> None:
    await pilot.press("3")
    await pilot.pause()
    pilot.app.query_one("#rows", Table).choose(key)
    await pilot.pause()


async def change_something(pilot: Pilot[None]) -> None:
    app = pilot.app
    assert isinstance(app, FieldkitApp)
    assert app.open_job is not None
    text = app.open_job.text
    app.change_text(lambda: text.with_value("title", "Another title"))
    await settled(pilot)


async def until(pilot: Pilot[None], wanted: Callable[[], bool]) -> None:
    """Handle messages until something holds."""
    for _ in range(500):
        if wanted():
            return
        await pilot.pause(0.01)
    raise AssertionError("it never came")
