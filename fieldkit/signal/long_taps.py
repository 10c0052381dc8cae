"""Find the blows in a recording too long for memory, stretch by stretch."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.progress import Progress
from fieldkit.signal.audio_stream import Read
from fieldkit.signal.blows import GUARD_S
from fieldkit.signal.modes import TapRecord
from fieldkit.signal.objections import Missing
from fieldkit.signal.source import RecordingSource
from fieldkit.signal.taps import Tap, TapSearch, find_taps, longest_whole, noise_level, without_gaps

Real = NDArray[np.float64]

STRETCH_S = 30.0
LONGEST_STRETCH_S = 120.0
"""A blow that rings for longer is cut there."""
LONGEST_BACKGROUND_S = 30.0
MOST_TAPS = 24
"""More of them cost time and memory and narrow little."""
MOST_SAMPLES = 6_000_000
"""Of all taps that are kept, together: 46 MiB."""
_LEAST_QUIET_S = 0.5
_LEAST_LEAD_S = 1.0
_LEAD_S = 4.0
"""Of quiet before the first blow of a stretch, as its background."""
_EDGE_S = 1.0
"""At the end of a stretch a blow cannot be told from its edge."""
_SEAM_S = 0.5
_PROGRESS = 0.25
_WEAK_SHARE = 0.05
"""Of the strongest blow: below it what cannot be used is not worth showing."""
_GRID_HZ = 4000.0
_GRID = 256


def find_taps_in(
    source: RecordingSource,
    channel: int = 1,
    *,
    gaps: Sequence[Missing] = (),
    progress: Progress | None = None,
) -> TapSearch:
    """``find_taps`` over a recording of any length, with memory that does not grow with it.

    Stretches of half a minute are searched one after the other. Each ends where it is quiet, or
    before a blow that still rings at its end, so that no decay is cut; each begins with the quiet
    before it, which is its background. The background that is handed on holds half a minute at
    most. Raises what reading the source raises, and Cancelled where progress says so.
    """
    taps: list[Tap] = []
    levels: list[float] = []
    with source.reading(channel) as read:
        for found, noise_rms in _stretches(source, read, gaps, progress or Progress()):
            taps += found
            levels.append(noise_rms)
        kept = _worth_showing(taps)
        if not kept:
            return TapSearch((), (0, source.frames), float(np.median(levels)))
        background = longest_whole(_background(kept, source), gaps)
        quiet = read(*background)
    noise_rms = noise_level(quiet, source.rate_hz, (0, len(quiet))) if len(quiet) else min(levels)
    return TapSearch(tuple(kept), background, noise_rms)


def cut_from(
    source: RecordingSource, channel: int, search: TapSearch, name: str = ""
) -> tuple[TapRecord, ...]:
    """Free decays of usable taps, each with the background they share.

    Where there are more than MOST_TAPS, or they are longer than MOST_SAMPLES together, some that
    are spread evenly over the recording.
    """
    chosen = spread([tap for tap in search.taps if tap.usable])
    background = search.background
    longest = int(LONGEST_BACKGROUND_S * source.rate_hz)
    quiet = source.stretch(channel, max(background[0], background[1] - longest), background[1])
    with source.reading(channel) as read:
        firsts = [tap.onset_guarded(source.rate_hz) for tap in chosen]
        stretches = [read(first, tap.end) for first, tap in zip(firsts, chosen, strict=True)]
    return tuple(
        TapRecord(
            stretch[tap.start - first :],
            source.rate_hz,
            quiet,
            name,
            before=stretch[: tap.start - first],
            since_blow_s=tap.start / source.rate_hz - tap.at_s,
        )
        for tap, first, stretch in zip(chosen, firsts, stretches, strict=True)
    )


def what_was_cut(search: TapSearch, records: Sequence[TapRecord]) -> tuple[str, ...]:
    """A note where not all usable taps were kept."""
    usable = sum(tap.usable for tap in search.taps)
    if len(records) == usable:
        return ()
    return (
        f"modes are estimated from {len(records)} of {usable} usable taps, spread evenly over the "
        "recording; more narrow them little",
    )


@dataclass(frozen=True)
class _Stretch:
    """Samples that are searched together."""

    first: int
    past: int
    own: int
    """From here on blows are told; those before are known."""
    lead: Real
    """Quiet samples put before it where it does not begin quietly itself."""


def _stretches(
    source: RecordingSource, read: Read, gaps: Sequence[Missing], progress: Progress
) -> Iterator[tuple[list[Tap], float]]:
    """The blows of one stretch after the other, each blow once, and their noise levels."""
    stretch = _Stretch(0, int(STRETCH_S * source.rate_hz), 0, np.zeros(0))
    while True:
        progress.step("looking for taps", stretch.own / source.frames)
        samples = np.concatenate([stretch.lead, read(stretch.first, stretch.past)])
        taps, noise_rms = _searched(samples, stretch, source, gaps)
        if stretch.past >= source.frames:
            yield taps, noise_rms
            return
        following = _next(stretch, taps, samples, source.rate_hz)
        yield [tap for tap in taps if tap.at_s * source.rate_hz < following.own], noise_rms
        stretch = following


def _searched(
    samples: Real, stretch: _Stretch, source: RecordingSource, gaps: Sequence[Missing]
) -> tuple[list[Tap], float]:
    """The stretch's own blows, placed in the recording, and its noise level."""
    shift = stretch.first - len(stretch.lead)
    found = find_taps(samples, source.rate_hz, full_scale=source.full_scale)
    placed = [
        without_gaps(_moved(t, shift, source.rate_hz), gaps, source.rate_hz) for t in found.taps
    ]
    return [tap for tap in placed if tap.at_s * source.rate_hz >= stretch.own], found.noise_rms


def _moved(tap: Tap, shift: int, rate_hz: float) -> Tap:
    at_s = tap.at_s + shift / rate_hz
    return replace(tap, at_s=at_s, start=tap.start + shift, end=tap.end + shift)


def _next(stretch: _Stretch, taps: Sequence[Tap], samples: Real, rate_hz: float) -> _Stretch:
    """The stretch to search after this one; itself, longer, where nothing in it is done with."""
    wanted = int(STRETCH_S * rate_hz)
    enough = stretch.own + _PROGRESS * wanted
    begin, until = _last_quiet(stretch, taps, rate_hz)
    last = taps[-1].at_s * rate_hz if taps else -np.inf
    length = stretch.past - stretch.first
    lead = np.zeros(0)
    if until > enough:
        first = max(begin, until - int(_LEAD_S * rate_hz))
    elif last > enough:
        until = int(last - GUARD_S * rate_hz)
        first, lead = until - int(_SEAM_S * rate_hz), _lead_of(stretch, taps, samples, rate_hz)
    elif length < LONGEST_STRETCH_S * rate_hz:
        return replace(stretch, past=stretch.first + 2 * length)
    else:
        until = stretch.past - int(_EDGE_S * rate_hz)
        first = until - int(_LEAD_S * rate_hz)
    first = _on_grid(first, rate_hz)
    return _Stretch(first, first + wanted, until, lead)


def _last_quiet(stretch: _Stretch, taps: Sequence[Tap], rate_hz: float) -> tuple[int, int]:
    """The last quiet part of a stretch that is long enough to begin the next; empty without one."""
    guard, edge = int(GUARD_S * rate_hz), int(_EDGE_S * rate_hz)
    begins = [stretch.first, *(tap.end for tap in taps)]
    ends = [*(int(tap.at_s * rate_hz) - guard for tap in taps), stretch.past - edge]
    quiet = [
        (begin, end)
        for begin, end in zip(begins, ends, strict=True)
        if end - begin >= _LEAST_LEAD_S * rate_hz
    ]
    return quiet[-1] if quiet else (stretch.own, stretch.own)


def _lead_of(stretch: _Stretch, taps: Sequence[Tap], samples: Real, rate_hz: float) -> Real:
    """Quiet for the next stretch, out of what is before the first blow of this one."""
    if len(stretch.lead):
        return stretch.lead
    quiet = int((taps[0].at_s - GUARD_S) * rate_hz) - stretch.first
    if quiet < _LEAST_QUIET_S * rate_hz:
        return stretch.lead
    return samples[: min(quiet, int(_LEAD_S * rate_hz))].copy()


def _on_grid(first: int, rate_hz: float) -> int:
    """The sample at which lowering the rate falls on the same samples as in the whole."""
    step = max(int(rate_hz // _GRID_HZ), 1) * _GRID
    return first // step * step


def _worth_showing(taps: Sequence[Tap]) -> list[Tap]:
    """Blows less the faint ticks that only a quiet stretch of its own brings out."""
    strongest = max((tap.peak for tap in taps), default=0.0)
    return [tap for tap in taps if tap.usable or tap.peak >= _WEAK_SHARE * strongest]


def _background(taps: Sequence[Tap], source: RecordingSource) -> tuple[int, int]:
    """What lies before the first blow, or the longest part after a decay; its last half minute."""
    rate_hz = source.rate_hz
    begins = [0, *(tap.end for tap in taps)]
    ends = [*(max(int((tap.at_s - GUARD_S) * rate_hz), 0) for tap in taps), source.frames]
    gaps = list(zip(begins, ends, strict=True))
    before = gaps[0]
    if before[1] < _LEAST_QUIET_S * rate_hz:
        before = max(gaps, key=lambda gap: gap[1] - gap[0])
    first, past = before
    return max(first, past - int(LONGEST_BACKGROUND_S * rate_hz)), past


def spread(taps: Sequence[Tap]) -> list[Tap]:
    """As many taps, evenly spread over all, as are to be held in memory; all where they fit."""
    for count in range(min(len(taps), MOST_TAPS), 0, -1):
        chosen = [taps[round(i)] for i in np.linspace(0, len(taps) - 1, count)]
        if sum(tap.end - tap.start for tap in chosen) <= MOST_SAMPLES:
            return chosen
    return list(taps[:1])
