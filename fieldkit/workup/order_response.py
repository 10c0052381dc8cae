"""What a change does to the answer of the pipe to each order, with the measured damping."""

from __future__ import annotations

from dataclasses import replace

from fieldkit.detune.excitation import bands
from fieldkit.detune.fixes import ChangeSpeed
from fieldkit.detune.known_modes import computed_modes, known_modes
from fieldkit.detune.order_response import OrderResponse, order_responses
from fieldkit.detune.push import parts
from fieldkit.detune.verdict import Verdict
from fieldkit.workup.chain import Workup


def order_response(work: Workup, fix: Verdict) -> tuple[OrderResponse, ...]:
    """Each order of the job, now and with a change; empty without modes to tell by."""
    job = work.job
    if work.detuning is None:
        return ()
    measured = work.evidence.modes
    now = known_modes(measured, work.detuning.modes, job.tapped, job.running)
    speeds = {part.excitation: part for part in parts(fix.change) if isinstance(part, ChangeSpeed)}
    excitations = [
        replace(one, speed_hz=(speeds[one.name].low_hz, speeds[one.name].high_hz))
        if one.name in speeds
        else one
        for one in job.excitations
    ]
    return order_responses(
        bands(job.excitations, 0.0),
        bands(excitations, 0.0),
        now,
        computed_modes(measured, fix.modes_after),
        job.goal.up_to_hz,
    )
