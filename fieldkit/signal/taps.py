"""Find the blows in a tap recording and say which of them can be used."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Tap:
    """One blow inside a recording."""

    at_s: float
    start: int
    """First sample of the free decay: after the contact, before the ringing is lost."""
    end: int
    """One past the last sample that belongs to this blow."""
    peak: float
    """Largest absolute sample, in the samples' unit."""
    usable: bool
    reasons: tuple[str, ...] = ()
    """Why it is not usable, in words for the user; empty when it is."""


@dataclass(frozen=True)
class TapSearch:
    """The blows of one channel and what lies before them."""

    taps: tuple[Tap, ...]
    background: tuple[int, int]
    """Sample range without any blow: before the first one or after a full decay; may be empty."""
    noise_rms: float
    """Robust noise level of the background, in the samples' unit."""
