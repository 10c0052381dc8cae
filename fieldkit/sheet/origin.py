"""Whether an answer rests on simulated recordings: one mark on every document and every text."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

from fieldkit.job.document import RecordingEntry
from fieldkit.sheet.plain import paragraph
from fieldkit.workup import simulated_files, simulated_notice


def marked(
    document: dict[str, Any], lines: list[str], entries: Iterable[RecordingEntry]
) -> tuple[dict[str, Any], list[str]]:
    """A document and a text that rest on these recordings, with the mark.

    ``simulated`` is always in the document, and the text begins with the notice.
    """
    notice = simulated_notice(simulated_files(entries))
    return document | {"simulated": bool(notice)}, [*mark(notice), *lines]


def mark(notice: str) -> list[str]:
    """The notice as lines, with a blank one behind it; nothing where there is none."""
    return [*paragraph(notice, 0, "! "), ""] if notice else []
