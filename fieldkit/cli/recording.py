"""Record from the command line: what was asked for, checked first; then until it is enough."""

from __future__ import annotations

import signal
import sys
import threading
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from fieldkit.capture.devices import Input, find_input, list_inputs
from fieldkit.capture.portaudio import PortAudioSource
from fieldkit.capture.practice import NAME as RIG
from fieldkit.capture.practice import PracticeSource
from fieldkit.capture.presets import Preset, presets, save_preset
from fieldkit.capture.quiet import libraries_kept_quiet
from fieldkit.capture.session import Session
from fieldkit.capture.setup import ChannelSetup
from fieldkit.capture.sidecar import Gap, gaps_of
from fieldkit.capture.snapshot import ENDED, OPENING, Snapshot
from fieldkit.cli.capture_tables import level_line
from fieldkit.cli.practice import Played, rig, rig_channels
from fieldkit.errors import InputError, Refusal
from fieldkit.job.recorded import next_recording, with_recording
from fieldkit.job.store import JobText, load_text
from fieldkit.quantity import chosen
from fieldkit.workup.simulated import check_not_mixed

_TICK_S = 0.1


@dataclass(frozen=True)
class Plan:
    """A recording to be made."""

    path: Path
    kind: str
    channels: tuple[ChannelSetup, ...]
    device: str | None = None
    rate_hz: int | None = None
    seconds: float | None = None
    job: Path | None = None
    wait_s: float = 30.0
    """An input that is away for longer ends the recording."""
    practice: bool = False
    """Whether the practice rig stands in for an input."""

    @staticmethod
    def from_words(
        target: Path,
        kind: str,
        device: str | None,
        rate_hz: int | None,
        channels: int | None,
        seconds: float | None,
        words: Mapping[str, Sequence[str] | None],
        preset: str | None,
        wait_s: float,
        practice: bool = False,
    ) -> Plan:
        """Checked as far as it can be without the input; raises InputError."""
        chosen(kind, "kind of recording", ("tap", "running"))
        kept = _preset(preset, practice)
        setups = _setups(channels, words, kept)
        job = target if target.suffix.lower() == ".toml" else None
        plan = Plan(
            path=target if job is None else next_recording(job, kind),
            kind=kind,
            channels=setups,
            device=device or (kept.device or None if kept and not practice else None),
            rate_hz=rate_hz or (kept.rate_hz if kept else None),
            seconds=seconds,
            job=job,
            wait_s=wait_s,
        )
        plan = practising(plan) if practice else plan
        if job is not None:
            check_not_mixed(load_text(job).job(), practice=practice)
            plan.in_job().job()
        return plan

    def in_job(self) -> JobText:
        """The job as it is on disk, with the recording in it; raises InputError."""
        assert self.job is not None
        keys = [setup.as_table() for setup in self.channels]
        return with_recording(load_text(self.job), self.path.name, self.kind, keys)

    def keep(self, name: str, shot: Snapshot) -> None:
        """Keep the set-up for the next visit."""
        save_preset(name, Preset(self.channels, shot.source, shot.rate_hz))


@dataclass(frozen=True)
class Recorded:
    """A recording that was made."""

    plan: Plan
    snapshot: Snapshot
    gaps: tuple[tuple[Path, Gap], ...]
    failure: str = ""
    """Why it ended early, as a sentence."""


def made(plan: Plan) -> Recorded:
    """Record, and add it to the job; raises Refusal where nothing was recorded."""
    with libraries_kept_quiet():
        source = source_of(plan)
        session = Session(source, keep_s=1.0, give_up_after_s=plan.wait_s)
        if isinstance(source, PracticeSource):
            session.add(Played(source, plan.kind))
        with _stop_wanted() as stop:
            session.start()
            try:
                wait_for_opening(session)
                session.record(plan.path, plan.channels, seconds=plan.seconds)
                _follow(session, stop)
            finally:
                session.stop()
                session.join(60.0)
                _show("")
    shot = session.snapshot()
    if shot.recording is None or shot.recording.seconds == 0:
        raise Refusal(shot.message or "nothing was recorded", "see that the input delivers")
    if plan.job is not None:
        plan.in_job().save()
    gaps = tuple((path, gap) for path in shot.recording.paths for gap in gaps_of(path))
    failure = shot.recording.failure or (shot.message if shot.failed else "")
    return Recorded(plan, shot, gaps, failure)


def practising(plan: Plan) -> Plan:
    """The plan with the practice rig in place of an input; raises InputError."""
    if plan.device is not None:
        raise InputError("an input and the practice rig are both asked for", "leave one out")
    channels = rig_channels(plan.job, plan.channels)
    return replace(plan, practice=True, channels=channels)


def _preset(name: str | None, practice: bool) -> Preset | None:
    """What was kept; raises InputError where there is no such, or it is not for a real sensor."""
    if name is None:
        return None
    kept = presets()
    if name not in kept:
        raise InputError(
            f"there is no preset {name!r}", f"there are: {', '.join(kept) or 'none yet'}"
        )
    if kept[name].device == RIG and not practice:
        raise InputError(
            f"the preset {name!r} was kept on {RIG}, whose sensor is simulated",
            "add --practice, or use another preset",
        )
    return kept[name]


def _setups(
    channels: int | None, words: Mapping[str, Sequence[str] | None], kept: Preset | None
) -> tuple[ChannelSetup, ...]:
    """One for each channel: what is said here goes before what the preset says."""
    said = {key: list(values) for key, values in words.items() if values}
    most = max((len(values) for values in said.values()), default=1)
    count = channels or (len(kept.channels) if kept else most)
    base = list(kept.channels if kept else ())[:count]
    base += [ChannelSetup()] * (count - len(base))
    for key, values in said.items():
        if len(values) not in (1, count):
            raise InputError(
                f"--{key.replace('_', '-')} is given {len(values)} times for {count} channel(s)",
                "give it once for all channels, or once for each",
            )
    return tuple(
        replace(setup, **{key: v[i if len(v) > 1 else 0] for key, v in said.items()})
        for i, setup in enumerate(base)
    )


def source_of(plan: Plan) -> PortAudioSource | PracticeSource:
    """What a plan records from; raises InputError or Refusal."""
    if plan.practice:
        return rig(plan.job, plan.channels, plan.kind, plan.rate_hz)
    device: Input = find_input(plan.device, list_inputs(check_rates=False))
    return PortAudioSource(device, rate_hz=plan.rate_hz, channels=len(plan.channels))


def wait_for_opening(session: Session) -> None:
    """Until the input delivers; raises Refusal where it cannot be opened."""
    while session.snapshot().state == OPENING:
        session.join(_TICK_S)
    if session.snapshot().state == ENDED:
        raise Refusal(session.snapshot().message)


def _follow(session: Session, stop: threading.Event) -> None:
    """Show the level until it is enough."""
    while not stop.wait(_TICK_S):
        shot = session.snapshot()
        _show(level_line(shot))
        if shot.state == ENDED or (shot.recording is not None and shot.recording.done):
            return


def _show(line: str) -> None:
    if sys.stderr.isatty():
        sys.stderr.write(f"\r\x1b[K{line}")
        sys.stderr.flush()


@contextmanager
def _stop_wanted() -> Iterator[threading.Event]:
    """Set by Ctrl-C, by SIGTERM, and by Enter where a person is at the keyboard."""
    stop = threading.Event()
    main = threading.current_thread() is threading.main_thread()
    numbers = (signal.SIGINT, signal.SIGTERM) if main else ()

    def note(_number: int, _frame: Any) -> None:
        stop.set()

    before = {number: signal.signal(number, note) for number in numbers}
    if sys.stdin is not None and sys.stdin.isatty():
        threading.Thread(target=_set_by_enter, args=(stop,), daemon=True).start()
    try:
        yield stop
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)


def _set_by_enter(stop: threading.Event) -> None:
    if sys.stdin.readline():
        stop.set()
