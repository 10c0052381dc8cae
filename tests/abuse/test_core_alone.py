"""The core runs without any face or sound card: each part in a program of its own."""

from __future__ import annotations

import subprocess
import sys

import pytest

FACES = ("fieldkit.ui", "fieldkit.cli", "textual", "typer", "rich", "click", "sounddevice")
PARTS = (
    "signal.recording",
    "signal.taps",
    "signal.modes",
    "signal.running",
    "span.modes",
    "span.handbook",
    "detune.match",
    "detune.rank",
    "detune.recheck",
    "job.schema",
    "job.store",
    "workup",
    "workup.rechecking",
    "sheet.compose",
    "sheet.html",
)
IMPORT = """
import importlib, sys
for part in sys.argv[1].split():
    importlib.import_module("fieldkit." + part)
faces = sys.argv[2].split()
print([name for name in sys.modules if name in faces or name.startswith("fieldkit.ui")])
"""


def loaded(*parts: str) -> str:
    """Which faces these parts of the package bring with them."""
    words = [sys.executable, "-c", IMPORT, " ".join(parts), " ".join(FACES)]
    done = subprocess.run(words, capture_output=True, text=True, check=True, timeout=250)
    return done.stdout.strip()


def test_core_imports_no_face_and_no_sound_card():
    """All parts together, in a fresh process."""
    assert loaded(*PARTS) == "[]"


@pytest.mark.parametrize("part", ["ui.app", "cli.commands"])
def test_a_face_would_be_found(part):
    """The same question about the faces has another answer."""
    assert loaded(part) != "[]"
