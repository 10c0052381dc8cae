"""Unsaved work is kept as it is typed, and offered again after a crash or a dropped line."""

from __future__ import annotations

import time
from collections.abc import Mapping
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from textual import work

from fieldkit.job import journal
from fieldkit.ui.document import OpenJob
from fieldkit.ui.job_app import JobApp

if TYPE_CHECKING:
    from fieldkit.job.draft import Draft
    from fieldkit.job.journal import Kept

SETTLE_S = 1.0
"""Quiet after a change before the disk is asked to hold it for good."""
RESTORE = (
    ("restore", "Take them up"),
    ("discard", "Throw them away"),
    ("back", "Back"),
)


class Keeping(JobApp):
    """The app's dealings with what is in no file yet."""

    def __init__(self) -> None:
        super().__init__()
        self.journal_key = ""
        """Under which the open job is kept; empty while there is none."""
        self.typing: Mapping[str, Any] = {}
        """The form that is open, as far as it is typed."""
        self._complained = False
        self._settling = False

    def begin_afresh(self) -> None:
        """Another job comes on the desk, and the user was asked about the one before."""
        self.forget_unsaved()
        self.journal_key = ""
        self.typing = {}

    def job_changed(self, opened: OpenJob | None) -> None:
        """Keep what the disk does not hold, and nothing else."""
        if opened is None:
            return
        key = self._key_for(opened)
        if self.journal_key and key != self.journal_key:
            journal.drop(self.journal_key)
        self.journal_key = key
        if not opened.unsaved and not self.typing:
            journal.drop(key)
            return
        self._keep(self._kept(opened))

    def _key_for(self, opened: OpenJob) -> str:
        if opened.path is not None:
            return journal.key_of(opened.path)
        started = self.journal_key.startswith("new-")
        return self.journal_key if started else journal.key_of(None)

    def _kept(self, opened: OpenJob) -> Kept:
        return journal.Kept(
            key=self.journal_key,
            path=str(opened.path or ""),
            title=self.desk.job.title if self.desk.job else "",
            text=opened.text.text,
            base=journal.digest(opened.saved.text) if opened.saved else "",
            typing=dict(self.typing),
        )

    def keep_typing(self, typing: Mapping[str, Any]) -> None:
        """A form was typed into; empty when it closed."""
        self.typing = typing
        self.job_changed(self.open_job)

    def keep_draft(self, key: str, draft: Draft) -> None:
        """The answers of a new job that is still being described."""
        self._keep(journal.Kept(key=key, title=draft.title, draft=asdict(draft)))

    def forget_unsaved(self) -> None:
        """The user threw the changes away, or saved them."""
        if self.journal_key:
            journal.drop(self.journal_key)

    def _keep(self, kept: Kept) -> None:
        try:
            journal.keep(kept)
        except OSError as error:
            if not self._complained:
                self._complained = True
                reason = (error.strerror or str(error)).lower()
                self.tell(f"Unsaved work cannot be kept safe ({reason}): save often.", wrong=True)
            return
        if not self._settling:
            self._settling = True
            self.set_timer(SETTLE_S, lambda: self._settle(kept.key))

    def _settle(self, key: str) -> None:
        self._settling = False
        self.settle_on_disk(key)

    @work(thread=True, exit_on_error=False, group="settle")
    def settle_on_disk(self, key: str) -> None:
        """Wait for the disk, in a thread."""
        journal.settle(key)


def restore_question(kept: Kept, file_text: str) -> str:
    """What is asked before a job is opened that has more than its file says."""
    lines = [f"Changes to this job from {when(kept.kept_s)} were never saved."]
    if kept.base and kept.base != journal.digest(file_text):
        lines.append("The file was changed by something else since then.")
    if journal.keeper_lives(kept):
        lines.append(f"They may still be open in another window (process {kept.process}).")
    return "\n\n".join(lines)


def when(moment_s: float, now_s: float | None = None) -> str:
    """``14:05`` today, ``yesterday 14:05``, else the date."""
    moment, now = time.localtime(moment_s), time.localtime(now_s)
    clock = time.strftime("%H:%M", moment)
    if moment[:3] == now[:3]:
        return f"today {clock}"
    day_before = time.localtime((now_s if now_s is not None else time.time()) - 86400)
    if moment[:3] == day_before[:3]:
        return f"yesterday {clock}"
    return time.strftime("%Y-%m-%d %H:%M", moment)
