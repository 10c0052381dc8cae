"""The job that is open: its text now, as it was saved, and the way back and forth."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from fieldkit.job.store import JobText

STEPS_BACK = 100


@dataclass(frozen=True)
class OpenJob:
    """A job text under edit; every change gives a new one."""

    text: JobText
    saved: JobText | None
    """The text as it stands on the disk; None for one never saved."""
    past: tuple[JobText, ...] = ()
    future: tuple[JobText, ...] = ()
    """What was taken back, the next to come first."""

    @property
    def unsaved(self) -> bool:
        """Whether the disk does not hold what the screen shows."""
        return self.saved is None or self.saved.text != self.text.text

    def edited(self, text: JobText) -> OpenJob:
        """With a new text; the old one can be had back."""
        past = (*self.past, self.text)[-STEPS_BACK:]
        return replace(self, text=text, past=past, future=())

    def undone(self) -> OpenJob:
        """As before the last edit, in the file of now; itself where there was none."""
        if not self.past:
            return self
        before = replace(self.past[-1], path=self.path)
        return replace(
            self, text=before, past=self.past[:-1], future=(self.text, *self.future)[:STEPS_BACK]
        )

    def redone(self) -> OpenJob:
        """As before the last undo; itself where there was none."""
        if not self.future:
            return self
        after = replace(self.future[0], path=self.path)
        past = (*self.past, self.text)[-STEPS_BACK:]
        return replace(self, text=after, past=past, future=self.future[1:])

    @property
    def path(self) -> Path | None:
        """Where it is saved."""
        return self.text.path

    def as_saved(self, text: JobText) -> OpenJob:
        """After its text went to the disk."""
        return replace(self, text=text, saved=text)
