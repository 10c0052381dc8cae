"""Nobody searches a folder: every document is led to, every picture is one that a script makes."""

from __future__ import annotations

import re
import sys
from collections.abc import Iterator
from pathlib import Path

from tests.docs.test_documents import ROOT, links_of

README = ROOT / "README.md"
DOCS = ROOT / "docs"
PICTURES = DOCS / "screenshots"
_SIZE = re.compile(r"-\d+x\d+$")


def reached(start: Path) -> set[Path]:
    """Every document that links lead to, one after the other."""
    found: set[Path] = set()
    waiting = [start]
    while waiting:
        page = waiting.pop()
        if page in found or page.suffix != ".md":
            continue
        found.add(page)
        waiting += [(page.parent / link).resolve() for link in links_of(page)]
    return found


def test_the_readme_leads_to_every_document() -> None:
    """Straight or by way of another document."""
    lost = {path.name for path in DOCS.glob("*.md")} - {path.name for path in reached(README)}
    assert not lost


def test_the_readme_leads_to_the_first_hour_and_the_limits_at_once() -> None:
    """Who is new needs the one, who relies on an answer the other."""
    assert {"docs/first-hour.md", "docs/limits.md"} <= set(links_of(README))


def pictured() -> Iterator[str]:
    """Names of the pictures that lie there, without their size."""
    for path in [*PICTURES.glob("*.svg"), *PICTURES.glob("*.png")]:
        yield _SIZE.sub("", path.stem)


def test_every_picture_is_one_the_script_makes() -> None:
    """A picture whose screen is gone would stay as it was for ever."""
    from fieldkit.ui.desk import STEPS

    script = (DOCS / "make_screenshots.py").read_text("utf-8")
    made = set(STEPS) | set(re.findall(r'"([a-z][a-z-]+)"', script))
    made |= {Path(name).stem for name in re.findall(r'"([\w.-]+\.png)"', script)}
    assert not set(pictured()) - made


def test_every_window_and_view_is_pictured_in_the_first_hour() -> None:
    """From the start screen to the recheck, each once at least."""
    from fieldkit.ui.desk import STEPS

    shown = {_SIZE.sub("", Path(link).stem) for link in links_of(DOCS / "first-hour.md")}
    wanted = {*STEPS, "start", "new-job", "guided-setup", "map", "curve", "recheck", "waterfall"}
    assert not wanted - {"sheet"} - shown
    assert "sheet-page" in shown


def test_the_pictures_hold_no_folder_of_whoever_made_them() -> None:
    """A home or scratch folder in a picture tells readers nothing."""
    held = [sys.prefix, str(Path.home()) + "/", "/tmp/", str(ROOT)]
    for path in PICTURES.glob("*.svg"):
        text = path.read_text("utf-8").replace("&#x2F;", "/")
        assert not [one for one in held if one in text], path.name
