"""The whole chain for one job: load, evidence, span, match, detune."""

from fieldkit.workup.chain import (
    StateModes,
    StepRefusal,
    Workup,
    at_rest,
    detuning,
    gather,
    matching,
    measured,
    run,
    state_modes,
)
from fieldkit.workup.evidence import evidence_from, with_running_modes
from fieldkit.workup.readings import (
    RunningReading,
    TapReading,
    entry_for,
    excitation_of,
    read_running_entry,
    read_tap,
    running_readings,
    tap_readings,
)
from fieldkit.workup.response import EffectiveMass, ResponseReading, response_reading
from fieldkit.workup.response_notes import response_notes
from fieldkit.workup.simulated import simulated_files, simulated_notice

__all__ = [
    "EffectiveMass",
    "ResponseReading",
    "RunningReading",
    "StateModes",
    "StepRefusal",
    "TapReading",
    "Workup",
    "at_rest",
    "detuning",
    "entry_for",
    "evidence_from",
    "excitation_of",
    "gather",
    "matching",
    "measured",
    "read_running_entry",
    "read_tap",
    "response_notes",
    "response_reading",
    "run",
    "running_readings",
    "simulated_files",
    "simulated_notice",
    "state_modes",
    "tap_readings",
    "with_running_modes",
]
