"""Open a page in headless Chromium and tell what it said, asked for and printed."""

from __future__ import annotations

import json
import os
import re
import shutil
import subprocess
import tempfile
from dataclasses import dataclass
from pathlib import Path

import pytest

REQUIRED = "FIELDKIT_REQUIRE_BROWSER"
_QUIET = (
    "--headless", "--no-sandbox", "--disable-gpu", "--no-first-run",
    "--disable-background-networking", "--host-resolver-rules=MAP * ~NOTFOUND",
    "--enable-logging=stderr", "--no-pdf-header-footer",
)  # fmt: skip
_OF_THE_BROWSER = "not an origin"
"""Who asks for what the browser itself wants: its clock, its dictionary."""
_POLICY = re.compile(r'<meta http-equiv="Content-Security-Policy"[^>]*>')


@dataclass(frozen=True)
class Seen:
    """What came of opening a page."""

    dom: str
    console: tuple[str, ...]
    """What the page said: errors, and requests that its policy blocked."""
    asked_for: tuple[str, ...]
    """Addresses the page asked for beyond itself."""


def browser() -> str:
    """Chromium; skips where there is none and nobody requires it."""
    found = next(filter(None, map(shutil.which, ("chromium", "chromium-browser"))), None)
    if found is None:
        if os.environ.get(REQUIRED):
            pytest.fail(f"{REQUIRED} is set and there is no chromium")
        pytest.skip("no chromium: apt install chromium")
    return found


def opened(page: Path, *options: str) -> Seen:
    """Load a page and give its document as it stands after any script."""
    with tempfile.TemporaryDirectory() as profile:
        log = Path(profile) / "net.json"
        ran = _run(profile, f"--log-net-log={log}", *options, "--dump-dom", page.as_uri())
        console = [line for line in ran.stderr.splitlines() if ":CONSOLE:" in line]
        return Seen(ran.stdout, tuple(console), _asked_for(log, page))


def printed(page: Path, out: Path) -> bytes:
    """Print a page to a PDF file, and give its bytes."""
    with tempfile.TemporaryDirectory() as profile:
        _run(profile, f"--print-to-pdf={out}", page.as_uri())
    return out.read_bytes()


def page_count(pdf: bytes) -> int:
    """How many pages a PDF file of Chromium has."""
    return len(re.findall(rb"/Type\s*/Page\b", pdf))


def page_sizes(pdf: bytes) -> set[tuple[int, int]]:
    """Width and height of the pages, points."""
    boxes = re.findall(rb"/MediaBox\s*\[\s*0\s+0\s+([\d.]+)\s+([\d.]+)\s*\]", pdf)
    return {(round(float(width)), round(float(height))) for width, height in boxes}


def free_copy(page: Path, added: str, name: str) -> Path:
    """The page without its policy and with something added: what it would do if it could."""
    text, count = _POLICY.subn("", page.read_text(encoding="utf-8"))
    assert count == 1
    copy = page.with_name(name)
    copy.write_text(text.replace("</body>", f"{added}</body>"), encoding="utf-8")
    return copy


def _run(profile: str, *options: str) -> subprocess.CompletedProcess[str]:
    command = [browser(), *_QUIET, f"--user-data-dir={profile}", *options]
    return subprocess.run(
        command, capture_output=True, text=True, errors="replace", timeout=120, check=True
    )


def _asked_for(log: Path, page: Path) -> tuple[str, ...]:
    text = log.read_text(encoding="utf-8")
    try:
        events = json.loads(text)["events"]
    except json.JSONDecodeError:
        events = json.loads(text.rstrip().rstrip(",") + "]}")["events"]
    found = [event["params"] for event in events if event.get("params", {}).get("initiator")]
    return tuple(
        one["url"]
        for one in found
        if one["initiator"] != _OF_THE_BROWSER and one["url"] != page.as_uri()
    )
