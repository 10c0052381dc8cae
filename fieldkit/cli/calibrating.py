"""Measure a sensitivity from the command line, and note it in the job and the preset."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from fieldkit.capture.calibration import NEEDED_S, Calibration, calibrate
from fieldkit.capture.practice import PracticeSource
from fieldkit.capture.presets import Preset, save_preset
from fieldkit.capture.quiet import libraries_kept_quiet
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.snapshot import ENDED, Snapshot
from fieldkit.cli.recording import Plan, source_of, wait_for_opening
from fieldkit.errors import InputError, Refusal
from fieldkit.job.recorded import with_calibration
from fieldkit.job.store import load_text
from fieldkit.quantity import parse
from fieldkit.sheet.plain import paragraph

_SETTLE_S = 0.5
_TICK_S = 0.05
_WAIT_TICKS = 1200


def calibrated(
    plan: Plan, channel: int, reference: str, keep: str | None
) -> tuple[dict[str, Any], list[str]]:
    """Listen to the reference shaker; what was found, as a document and as lines.

    Raises InputError or Refusal where nothing can be measured, and then changes nothing.
    """
    setup = _setup(plan, channel)
    reference_rms = parse(reference, "acceleration")
    if reference_rms <= 0:
        raise InputError(f"a reference of {reference!r}", "name the level of the shaker: 10 m/s^2")
    samples, shot = _heard(plan, reference_rms)
    found = calibrate(samples[:, channel - 1], shot.rate_hz, reference_rms=reference_rms)
    files = _note(plan.job, channel, found, setup, shot)
    if keep is not None:
        setups = list(plan.channels)
        setups[channel - 1] = found.setup(setup)
        save_preset(keep, Preset(tuple(setups), shot.source, shot.rate_hz))
    return _document(found, setup, channel, shot, files), _lines(found, setup, channel, shot, files)


def _setup(plan: Plan, channel: int) -> ChannelSetup:
    if not 1 <= channel <= len(plan.channels):
        raise InputError(
            f"there is no channel {channel}: {len(plan.channels)} are listened to",
            "say how many with --channels",
        )
    setup = plan.channels[channel - 1]
    if setup.quantity != "acceleration":
        raise InputError(
            f"a reference shaker cannot calibrate a channel for {setup.quantity}",
            "calibrate an accelerometer",
        )
    return setup


def _heard(plan: Plan, reference_rms: float) -> tuple[Any, Snapshot]:
    """(n, channels) of a few seconds without a gap."""
    with libraries_kept_quiet():
        source = source_of(plan)
        if isinstance(source, PracticeSource):
            source.shake(reference_rms)
        session = Session(source, keep_s=NEEDED_S + _SETTLE_S, give_up_after_s=plan.wait_s)
        session.start()
        try:
            wait_for_opening(session)
            for _ in range(_WAIT_TICKS):
                session.join(_TICK_S)
                _, samples = session.latest()
                enough = len(samples) >= (NEEDED_S + _SETTLE_S) * source.rate_hz
                if enough or session.snapshot().state == ENDED:
                    break
        finally:
            session.stop()
            session.join(10.0)
    shot = session.snapshot()
    if not enough and shot.message:
        raise Refusal(shot.message, "calibrate again")
    return samples[-round(NEEDED_S * source.rate_hz) :], shot


def _note(
    job: Path | None, channel: int, found: Calibration, setup: ChannelSetup, shot: Snapshot
) -> tuple[str, ...]:
    """Write date and result into the job; the files of recordings that it calibrated."""
    if job is None:
        return ()
    where = "simulated by the practice rig" if shot.simulated else f"through {shot.source}"
    comment = f"{found.comment(setup.full_scale)}, {where}"
    text, files = with_calibration(load_text(job), channel, found.keys(setup.full_scale), comment)
    text.job()
    text.save()
    return files


def _document(
    found: Calibration, setup: ChannelSetup, channel: int, shot: Snapshot, files: tuple[str, ...]
) -> dict[str, Any]:
    return {
        "channel": channel,
        **found.keys(setup.full_scale),
        "m_per_s2_per_unit": found.si_per_unit,
        "relative_sd": found.relative_sd,
        "frequency_hz": found.frequency_hz,
        "reference_m_per_s2_rms": found.reference_rms,
        "level_sd": found.level_sd,
        "distortion": found.distortion,
        "date": found.day.isoformat(),
        "device": shot.source,
        "simulated": shot.simulated,
        "calibrated_recordings": list(files),
    }


def _lines(
    found: Calibration, setup: ChannelSetup, channel: int, shot: Snapshot, files: tuple[str, ...]
) -> list[str]:
    lines = [f"channel {channel} {found.comment(setup.full_scale)}"]
    if shot.simulated:
        lines += paragraph("simulated by the practice rig: nothing was measured", 2, "! ")
    if (before := setup.si_per_unit) is not None:
        off = found.si_per_unit / before - 1
        lines.append(f"  a sample of 1 stands for {100 * off:+.1f} % of what was written before")
    if files:
        lines.append(f"  written into the job for {', '.join(files)}")
    return lines
