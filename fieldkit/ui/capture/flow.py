"""From the key to the job: set-up, measurement, and what came of it into the job."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from fieldkit.errors import FieldkitError
from fieldkit.job.recorded import with_calibration
from fieldkit.ui.capture.bench import Bench
from fieldkit.ui.capture.calibration_run import Calibrated
from fieldkit.ui.capture.channel_forms import machines
from fieldkit.ui.capture.running_run import RunningRun
from fieldkit.ui.capture.running_screen import RunningScreen
from fieldkit.ui.capture.setup_screen import SetupScreen
from fieldkit.ui.capture.takes import (
    Result,
    free_path,
    practice_copy,
    with_takes,
)
from fieldkit.ui.capture.tap_run import TapRun
from fieldkit.ui.capture.tap_screen import TapScreen
from fieldkit.ui.capture.wiring import Wiring
from fieldkit.ui.document import OpenJob
from fieldkit.ui.plots import shaded
from fieldkit.ui.words import count
from fieldkit.workup.simulated import holds_practice, measured_for_real

if TYPE_CHECKING:
    from fieldkit.job.document import Job
    from fieldkit.ui.measuring import Measuring

MIXED = (
    "this job holds simulated recordings, and simulated and measured data do not mix: open the "
    "job of the pipe, or start a new one (n)"
)


async def measure(app: Measuring, kind: str, bench: Bench) -> None:
    """The whole way; ends where the user leaves, or with the recordings in the job."""
    wiring: Wiring | None = replace(app.wiring, kind=kind) if app.wiring else Wiring(kind)
    while wiring is not None and app.desk.job is not None:
        wiring = await app.push_screen_wait(
            SetupScreen(
                wiring,
                app.desk.job,
                bench,
                lambda found, i: note(app, found, i),
                fresh=app.wiring is None,
            )
        )
        if wiring is None:
            return
        app.wiring = wiring
        if not await _kept_apart(app, wiring):
            continue
        result = await app.push_screen_wait(_live(app, wiring, bench))
        if result.again and not result.quits:
            if result.trouble:
                app.tell(result.trouble, wrong=True)
            continue
        _finish(app, wiring, result)
        if result.quits:
            app.action_quit()
        return


def _live(app: Measuring, wiring: Wiring, bench: Bench) -> TapScreen | RunningScreen:
    job, path = app.desk.job, app.open_job.path if app.open_job else None
    assert job is not None
    assert path is not None
    bands = shaded(app.desk)
    if wiring.kind == "running":
        return RunningScreen(lambda: RunningRun.begin(job, path, wiring, bench), job.title, bands)
    return TapScreen(lambda: TapRun.begin(job, path, wiring, bench), job.title, job.units, bands)


async def _kept_apart(app: Measuring, wiring: Wiring) -> bool:
    """See to it that simulated and measured data never meet in one job; False: not this way."""
    job, opened = app.desk.job, app.open_job
    assert job is not None
    assert opened is not None
    if not wiring.practice:
        if holds_practice(job):
            app.tell(MIXED, wrong=True)
            return False
        return True
    if not measured_for_real(job):
        return True
    if not await app.may_go_on():
        return False
    folder = opened.path.parent if opened.path else Path.cwd()
    stem = f"{opened.path.stem if opened.path else 'job'}-practice"
    try:
        text = practice_copy(opened.text, free_path(folder, stem))
        saved = text.save()
        app.begin(OpenJob(saved, saved), saved.job())
    except FieldkitError as error:
        app.tell(str(error), wrong=True)
        return False
    app.tell(f"Practising on a copy of the description, {saved.path}: what was measured stays out.")
    return True


def _finish(app: Measuring, wiring: Wiring, result: Result) -> None:
    """The recordings into the job, or where they lie."""
    if result.trouble:
        app.tell(result.trouble, wrong=True)
    left = [take.path.name for take in result.takes if take.path.exists()]
    if not result.add:
        if left:
            app.tell(f"Kept on the disk, not in the job: {', '.join(left)}")
        return
    if add(app, result):
        app.action_view("running" if wiring.kind == "running" else "tap")
    for told in _speeds_outside(wiring, app.desk.job):
        app.tell(told, wrong=True)


def add(app: Measuring, result: Result) -> bool:
    """Write the useful recordings into the job; saved where nothing else is unsaved."""
    opened, takes = app.open_job, result.useful
    if opened is None or not takes:
        return False
    clean = not opened.unsaved
    if not app.change_text(lambda: with_takes(opened.text, takes)):
        return False
    names = ", ".join(take.path.name for take in takes)
    what = f"{count(len(takes), 'recording')} in the job: {names}"
    idle = [take.path.name for take in result.takes if not take.usable and take.path.exists()]
    if idle:
        what += f"; {', '.join(idle)} holds no usable blow and stays out"
    app.tell(what if clean and save(app) else f"{what}. The job is not saved yet: ctrl+s saves it.")
    return True


def save(app: Measuring) -> bool:
    """Write the job as it is; False, and a sentence, where it cannot be."""
    assert app.open_job is not None
    try:
        app.open_job = app.open_job.as_saved(app.open_job.text.save())
    except FieldkitError as error:
        app.tell(str(error), wrong=True)
        return False
    app.refresh_desk()
    return True


def note(app: Measuring, found: Calibrated, channel: int) -> None:
    """Date and result of a calibration into the job."""
    opened, job = app.open_job, app.desk.job
    if opened is None or job is None:
        return
    if found.simulated and measured_for_real(job):
        app.tell("Calibrated on the practice rig: the job, which is measured, is left alone.")
        return
    clean = not opened.unsaved
    keys = found.found.keys(found.full_scale)
    changed = app.change_text(
        lambda: with_calibration(opened.text, channel + 1, keys, found.comment)[0]
    )
    if changed and clean:
        save(app)


def _speeds_outside(wiring: Wiring, job: Job | None) -> list[str]:
    """Speeds that were read and lie outside what the job says."""
    if job is None or wiring.kind != "running":
        return []
    told = []
    for excitation in job.excitations:
        speed_hz = wiring.speeds_hz.get(excitation.name)
        if speed_hz is None or excitation.speed_hz is None or excitation.name not in machines(job):
            continue
        low, high = excitation.speed_hz
        if not low * 0.999 <= speed_hz <= high * 1.001:
            told.append(
                f"{excitation.name} ran at {60 * speed_hz:.0f} rpm, outside the {60 * low:.0f} to "
                f"{60 * high:.0f} rpm of the job: correct its speed in Span (3)"
            )
    return told
