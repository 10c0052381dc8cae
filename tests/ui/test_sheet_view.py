"""The Sheet view: the advice on screen, and the whole sheet written to a file."""

from __future__ import annotations

import json
import zipfile
from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import Input

from fieldkit.sheet import compose
from fieldkit.sheet.beyond import Results
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.dialogs import PathScreen, PickScreen
from tests.ui.driving import opened, said, settled, text_of
from tests.ui.job_text import JOB_TEXT

HOSTILE = "[red]<script>alert(1)</script>\\u001b[31m[/red] $x$ | `a` *b*"


@pytest.fixture(autouse=True)
def _no_solver(monkeypatch: pytest.MonkeyPatch) -> None:
    """The made-up workup has no ensemble that anything could be installed on."""
    monkeypatch.setattr(compose, "results", lambda work, basis, _progress: Results(work, basis))


async def write(pilot: Pilot[None], choice: int) -> Path:
    """Press w, pick a format, take the path that is offered; it is given back."""
    await pilot.press("6", "w")
    await settled(pilot)
    assert isinstance(pilot.app.screen, PickScreen)
    await pilot.press(*["down"] * choice, "enter")
    await settled(pilot)
    assert isinstance(pilot.app.screen, PathScreen)
    path = Path(pilot.app.screen.query_one(Input).value)
    await pilot.press("enter")
    await settled(pilot)
    return path


async def test_w_writes_a_page_beside_the_job_and_says_where(
    app: FieldkitApp, job_path: Path
) -> None:
    async with opened(app) as pilot:
        path = await write(pilot, 0)
        assert path == job_path.with_name("job-sheet.html")
        assert "<h1>Glycol booster, discharge line</h1>" in path.read_text(encoding="utf-8")
        assert f"Written to {path}" in said(app)


async def test_the_same_can_be_had_as_markdown(app: FieldkitApp, job_path: Path) -> None:
    async with opened(app) as pilot:
        path = await write(pilot, 1)
        assert path == job_path.with_name("job-sheet.md")
        assert "\n# Glycol booster, discharge line\n" in path.read_text(encoding="utf-8")


async def test_a_bundle_without_its_recordings_is_refused_in_a_sentence(
    app: FieldkitApp, job_path: Path
) -> None:
    async with opened(app) as pilot:
        path = await write(pilot, 2)
        assert not path.exists()
        assert any("recording is missing" in sentence for sentence in said(app))


async def test_a_bundle_holds_job_recordings_and_sheet(app: FieldkitApp, job_path: Path) -> None:
    for name in ("tap-1.flac", "running.flac"):
        job_path.with_name(name).write_bytes(b"sound")
    async with opened(app) as pilot:
        path = await write(pilot, 2)
        assert said(app)[-1] == f"Written to {path}"
        with zipfile.ZipFile(path) as held:
            told = json.loads(held.read("manifest.json"))
            assert {"job.toml", "sheet.html", "sheet.md", "tap-1.flac"} <= {
                one["file"] for one in told["files"]
            }


async def test_a_file_of_another_kind_is_never_written_over(
    app: FieldkitApp, job_path: Path
) -> None:
    other = job_path.with_name("job-sheet.html")
    other.write_text("<p>minutes of the meeting</p>", encoding="utf-8")
    async with opened(app) as pilot:
        await write(pilot, 0)
        assert other.read_text(encoding="utf-8") == "<p>minutes of the meeting</p>"
        assert any("is no sheet" in sentence for sentence in said(app))


async def test_a_hostile_title_is_plain_text_on_screen_and_in_the_page(
    tmp_path: Path, quick: None
) -> None:
    path = tmp_path / "job.toml"
    path.write_text(JOB_TEXT.replace("Glycol booster, discharge line", HOSTILE), encoding="utf-8")
    app = FieldkitApp(path)
    async with opened(app) as pilot:
        page = (await write(pilot, 0)).read_text(encoding="utf-8")
        shown = text_of(app, "#sheet-text")
        assert shown.startswith("[red]<script>alert(1)</script>\\u001b[31m[/red]")
        assert "\x1b" not in app.export_screenshot()
        assert "<script" not in page
        assert "[red]&lt;script&gt;alert(1)&lt;/script&gt;\\u001b[31m[/red]" in page
