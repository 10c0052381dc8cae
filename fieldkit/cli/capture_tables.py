"""Inputs and recordings as documents for programs and lines for people."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from fieldkit.capture.meter import decibels
from fieldkit.capture.snapshot import RUNNING, Snapshot
from fieldkit.sheet.plain import clean, paragraph, table

if TYPE_CHECKING:
    from fieldkit.capture.devices import Input
    from fieldkit.cli.recording import Recorded

_BAR = 20
_BAR_DB = 3.0


def input_documents(inputs: Sequence[Input]) -> list[dict[str, Any]]:
    """One for each input."""
    return [
        {
            "index": device.index,
            "name": device.name,
            "host_api": device.host_api,
            "channels": device.channels,
            "default_rate_hz": device.default_rate_hz,
            "rates_hz": list(device.rates_hz),
            "default": device.default,
        }
        for device in inputs
    ]


def input_lines(inputs: Sequence[Input]) -> list[str]:
    """A table of inputs; the default one is marked."""
    rows = [
        [
            f"{device.index}{'*' if device.default else ''}",
            device.name,
            device.host_api,
            str(device.channels),
            " ".join(f"{rate / 1000:g}" for rate in device.rates_hz) or "none",
        ]
        for device in inputs
    ]
    head = ["input", "name", "through", "channels", "rates, kHz"]
    return ["Inputs (* taken where none is named)", *table(head, rows)]


def level_line(shot: Snapshot) -> str:
    """Time and levels on one line, with what there is to tell."""
    seconds = shot.recording.seconds if shot.recording else 0.0
    meters = "  ".join(_meter(level.peak, level.held, level.clipped) for level in shot.levels)
    told = f"  {clean(shot.message)}" if shot.message else ""
    if shot.state != RUNNING:
        return f"{seconds:7.1f} s  {shot.state}{told}"
    return f"{seconds:7.1f} s  {meters}{told}"


def _meter(peak: float, held: float, clipped: bool) -> str:
    filled = max(0, min(_BAR, round(_BAR + decibels(peak) / _BAR_DB)))
    lamp = " CLIP" if clipped else ""
    return f"{'|' * filled}{'.' * (_BAR - filled)} {decibels(held):4.0f} dB{lamp}"


def recorded_document(done: Recorded) -> dict[str, Any]:
    """A recording just made."""
    shot, state = done.snapshot, done.snapshot.recording
    assert state is not None
    return {
        "files": [str(path) for path in state.paths],
        "job": None if done.plan.job is None else str(done.plan.job),
        "device": shot.source,
        "rate_hz": shot.rate_hz,
        "channels": len(done.plan.channels),
        "duration_s": round(state.seconds, 6),
        "simulated": shot.simulated,
        "clipped_samples": [level.clipped_samples for level in shot.levels],
        "gaps": [
            {
                "file": str(path),
                "at_s": gap.frame / shot.rate_hz,
                "lost_frames": gap.lost_frames,
                "exact": gap.exact,
                "cause": gap.cause,
            }
            for path, gap in done.gaps
        ],
    }


def recorded_lines(done: Recorded) -> list[str]:
    """A recording just made."""
    shot, state = done.snapshot, done.snapshot.recording
    assert state is not None
    files = " and ".join(path.name for path in state.paths)
    where = "" if done.plan.job is None else f", added to {done.plan.job.name}"
    lines = [
        f"{clean(files)}: {state.seconds:.2f} s, {len(done.plan.channels)} channel(s) at "
        f"{shot.rate_hz} Hz from {clean(shot.source)}{where}"
    ]
    for number, level in enumerate(shot.levels, start=1):
        if level.clipped_samples:
            said = f"channel {number} clipped in {level.clipped_samples} samples: lower its gain"
            lines += paragraph(said, 2, "! ")
    for path, gap in done.gaps:
        about = "an unknown number of" if gap.lost_frames is None else str(gap.lost_frames)
        said = (
            f"{path.name}: {about} frames missing at {gap.frame / shot.rate_hz:.2f} s ({gap.cause})"
        )
        lines += paragraph(said, 2, "! ")
    return lines
