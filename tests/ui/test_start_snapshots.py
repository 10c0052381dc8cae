"""Pictures of the start screen, the guided path, the picker and a faulty file, at both sizes."""

from __future__ import annotations

from collections.abc import Awaitable, Callable
from pathlib import Path

import pytest
from textual.pilot import Pilot
from textual.widgets import Input

from fieldkit.job import journal, recent
from fieldkit.job.draft import Draft
from fieldkit.ui.app import FieldkitApp
from fieldkit.ui.start.guided import GuidedScreen
from fieldkit.ui.start.start_screen import StartScreen
from tests.ui.driving import until

SIZES = [(80, 24), (120, 40)]
DRAFT = Draft(
    pipe={"title": "Booster line", "size": "NPS 4", "schedule": "40", "contents": "water"},
    rows={
        "leg": ({"direction": "+x", "length": "20' 3\""}, {"direction": "+z", "length": "2 m"}),
        "support": ({"at": "0 m", "kind": "anchor"}, {"at": "4 m", "kind": "clamp"}),
        "mass": ({"name": "check valve", "at": "2 m", "mass": "50 lb"},),
        "excitation": ({"machine": "centrifugal pump", "speed": "1450 to 1495 rpm", "count": "7"},),
    },
    half={"leg": {"direction": "+y", "length": "1"}, "support": {"at": "8 m", "kind": "u"}},
)
STEPS = ("pipe", "leg", "support", "mass", "excitation", "goal")


class QuietApp(FieldkitApp):
    """The app without threads: nothing changes behind a picture."""

    def warm_libraries(self) -> None:  # type: ignore[override]
        """Nothing is worked out here."""


@pytest.fixture(autouse=True)
def _still(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """An empty folder of a fixed name, and a clock that stands still."""
    folder = tmp_path / "site"
    folder.mkdir()
    monkeypatch.chdir(folder)
    monkeypatch.setattr("fieldkit.ui.start.picker.home_short", lambda path: f"~/{path.name}")
    monkeypatch.setattr("fieldkit.ui.start.start_screen.home_short", lambda p: f"~/{p.name}")
    monkeypatch.setattr("fieldkit.ui.start.steps.home_short", lambda path: f"~/{path.name}")
    monkeypatch.setattr("fieldkit.ui.start.start_screen.when", lambda _moment: "today 14:05")


Ready = Callable[[Pilot[None]], Awaitable[None]]


async def started(pilot: Pilot[None]) -> None:
    """The start screen, with every state told."""
    await until(pilot, lambda: isinstance(pilot.app.screen, StartScreen))
    screen = pilot.app.screen
    assert isinstance(screen, StartScreen)
    await until(pilot, lambda: len(screen.told) == len(screen.recent))
    await pilot.pause()


@pytest.mark.parametrize("size", SIZES, ids=["80x24", "120x40"])
def test_the_start_screen(snap_compare: Callable[..., bool], size: tuple[int, int]) -> None:
    for name, state in (("riser", "no recordings yet"), ("booster", "3 taps, best fix 94 %")):
        path = Path(f"{name}.toml")
        path.write_text(f'fieldkit = 1\ntitle = "{name.capitalize()} line"\n', encoding="utf-8")
        recent.remember(path, state)
    half = {"rows": {"leg": [{}, {}]}}
    journal.keep(journal.Kept("new-1", title="Suction line", draft=half))
    assert snap_compare(QuietApp(), terminal_size=size, run_before=started)


@pytest.mark.parametrize("size", SIZES, ids=["80x24", "120x40"])
@pytest.mark.parametrize("step", STEPS)
def test_the_guided_path(
    snap_compare: Callable[..., bool], step: str, size: tuple[int, int]
) -> None:
    async def go(pilot: Pilot[None]) -> None:
        await until(pilot, lambda: isinstance(pilot.app.screen, StartScreen))
        draft = Draft(DRAFT.pipe, DRAFT.goal, DRAFT.rows, DRAFT.half, {}, STEPS.index(step))
        screen = GuidedScreen(draft, Path.cwd())
        await pilot.app.push_screen(screen)
        await until(pilot, lambda: screen.pane is not None)
        await until(pilot, lambda: screen.pane is not None and screen.pane.fields.here is not None)
        for cursor in screen.query(Input):
            cursor.cursor_blink = False
        await pilot.pause()

    assert snap_compare(QuietApp(), terminal_size=size, run_before=go)


@pytest.mark.parametrize("size", SIZES, ids=["80x24", "120x40"])
def test_the_picker(snap_compare: Callable[..., bool], size: tuple[int, int]) -> None:
    Path("old").mkdir()
    for name in ("one", "two"):
        text = f'fieldkit = 1\ntitle = "Line {name}"\n'
        Path(f"{name}.toml").write_text(text, encoding="utf-8")

    async def go(pilot: Pilot[None]) -> None:
        await started(pilot)
        await pilot.press("o")
        await until(pilot, lambda: len(getattr(pilot.app.screen, "said", {})) == 2)
        pilot.app.screen.query_one(Input).cursor_blink = False
        await pilot.pause()

    assert snap_compare(QuietApp(), terminal_size=size, run_before=go)


@pytest.mark.parametrize("size", SIZES, ids=["80x24", "120x40"])
def test_a_faulty_file(snap_compare: Callable[..., bool], size: tuple[int, int]) -> None:
    lines = ["fieldkit = 1", 'title = "Booster"', "", "[pipe]", 'size = "NPS 4"', "schedule = 41"]
    Path("job.toml").write_text("\n".join([*lines, 'material = "carbon steel"', ""]))

    async def go(pilot: Pilot[None]) -> None:
        await until(pilot, lambda: len(pilot.app.screen_stack) > 1)
        pilot.app.clear_notifications()
        await pilot.pause()

    assert snap_compare(QuietApp(Path("job.toml")), terminal_size=size, run_before=go)
