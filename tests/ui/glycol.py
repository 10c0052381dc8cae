"""One invented job with every result written down by hand: what the screens are tested on."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np

from fieldkit.detune.contradictions import Contradiction
from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation, Goal, bands
from fieldkit.detune.fixes import AddMass, AddSupport, StiffenSupport
from fieldkit.detune.known_modes import known_modes
from fieldkit.detune.matched import Ensemble, Match, ModelMode, Pair, ParameterReading
from fieldkit.detune.next_blow import Blow, Expected, sentence
from fieldkit.detune.verdict import Detuning, JudgedMode, Nearest, Verdict
from fieldkit.job.document import Job, RecordingEntry
from fieldkit.signal.modes import MeasuredMode, RefusedMode, TapRecord, Tone
from fieldkit.signal.running import RunningLine, RunningPicture
from fieldkit.signal.spectrum import Spectrum
from fieldkit.signal.taps import Tap, TapSearch
from fieldkit.span.gap_formulas import HandbookEstimate
from fieldkit.span.layout import Leg, PointMass, Span, State, Support
from fieldkit.span.materials import Material
from fieldkit.span.modes import Mode
from fieldkit.span.pipes import PipeSection
from fieldkit.workup import RunningReading, StateModes, TapReading, Workup
from fieldkit.workup.findings import Findings, running_findings

PIPE = PipeSection(0.0889, 0.00549, "NPS 3 schedule 40")
STEEL = Material("carbon steel", 7850.0, 0.3, ((293.15, 203e9),), 11.7e-6)
SPAN = Span(
    PIPE,
    STEEL,
    legs=(Leg((1.0, 0.0, 0.0), 4.2), Leg((0.0, 0.0, 1.0), 1.1, 0.1143)),
    supports=(
        Support(0.0, "anchor"),
        Support(3.4, "clamp", vertical="unknown", lateral=2e6),
        Support(5.3, "nozzle"),
    ),
    masses=(PointMass(2.0, 24.0, "check valve"),),
    contents_density_kg_per_m3=998.0,
)
PUMP = Excitation("pump", (1450 / 60, 1495 / 60), (1.0, 2.0, 6.0))
RIPPLE = Excitation("drive ripple", frequency_hz=(100.0, 100.0))
TAP_ENTRY = RecordingEntry(Path("tap-1.flac"), "tap", "tapped", direction="vertical", at_m=1.9)
RUN_ENTRY = RecordingEntry(Path("running.flac"), "running", "running", scale=9.81)


def job(path: Path | None = None, **changes: object) -> Job:
    """The job the text above describes."""
    whole = Job(
        title="Glycol booster, discharge line",
        units="SI",
        span=SPAN,
        tapped=State("tapped", fill=(0.0, 0.0)),
        running=State("running", temperature_k=338.15, pressure_pa=6e5),
        excitations=(PUMP, RIPPLE),
        recordings=(TAP_ENTRY, RUN_ENTRY),
        goal=Goal(),
        contents_name="water",
        path=path,
    )
    return replace(whole, **changes)  # type: ignore[arg-type]


MODES = (
    MeasuredMode(23.41, 0.02, 0.0110, 0.0006, "vertical", 3, 1.0, at_m=1.9),
    MeasuredMode(31.77, 0.05, 0.0142, 0.0011, "lateral", 3, 0.42, at_m=1.9),
    MeasuredMode(88.3, 0.2, 0.008, 0.002, None, 2, 0.11, at_m=1.9),
)
EVIDENCE = Evidence(
    modes=MODES,
    tones=(Tone(50.0, 0.02),),
    refused=(RefusedMode(147.2, "seen in one tap of four only"),),
)


def resonances(frequency_hz: np.ndarray) -> np.ndarray:
    """Magnitude of three decays, a mains line and a floor."""
    total = np.full(len(frequency_hz), 2e-3)
    for mode in MODES:
        ratio = frequency_hz / mode.frequency_hz
        wide = (1 - ratio**2) ** 2 + (2 * (mode.damping_ratio or 0.01) * ratio) ** 2
        total += 0.05 * mode.strength / np.sqrt(wide) * ratio**2 / (1 + ratio**2)
    return total


def decay() -> tuple[np.ndarray, float]:
    """Six blows in 20 s at 400 samples/s; the fourth clips, the fifth is struck twice."""
    rate_hz = 400.0
    time_s = np.arange(int(20 * rate_hz)) / rate_hz
    samples = 1e-3 * np.sin(2 * np.pi * 50.0 * time_s)
    for at_s, height in ((2.1, 0.6), (5.0, 0.5), (8.1, 0.7), (11.0, 1.6), (14.0, 0.4), (14.3, 0.3)):
        after = np.clip(time_s - at_s, 0.0, None)
        ringing = np.sin(2 * np.pi * 23.41 * after) * np.exp(-0.011 * 2 * np.pi * 23.41 * after)
        samples = samples + height * np.where(time_s >= at_s, ringing, 0.0)
    return np.clip(samples, -1.0, 1.0), rate_hz


def tap(at_s: float, end_s: float, peak: float, *reasons: str) -> Tap:
    """A blow of the recording above."""
    return Tap(at_s, int(at_s * 400) + 4, int(end_s * 400), peak, not reasons, reasons)


TAPS = (
    tap(2.1, 5.0, 0.6),
    tap(5.0, 8.1, 0.5),
    tap(8.1, 11.0, 0.7),
    tap(11.0, 14.0, 1.0, "clipped: the sensor ran out of range"),
    tap(14.0, 14.3, 0.4, "struck twice: another blow 0.3 s later"),
)


def tap_reading() -> TapReading:
    """The tap recording, read."""
    samples, rate_hz = decay()
    lines_hz = np.arange(0.0, 200.0, 0.25)
    records = tuple(
        TapRecord(samples[t.start : t.end], rate_hz, samples[:800], "tap-1.flac")
        for t in TAPS
        if t.usable
    )
    spectrum = Spectrum(lines_hz, resonances(lines_hz), "decay", "acceleration", "m/s^2", 0.25)
    return TapReading(
        "tap-1.flac",
        rate_hz,
        1,
        20.0,
        TapSearch(TAPS, (0, 800), 7e-4),
        records,
        spectrum,
        TAP_ENTRY,
    )


def running_reading() -> RunningReading:
    """The running recording, read."""
    lines_hz = np.arange(0.0, 200.0, 0.5)
    amplitude = 0.02 * resonances(lines_hz) + 1e-3
    lines = (
        RunningLine(49.1, 3.2, 210.0),
        RunningLine(24.55, 0.9, 60.0),
        RunningLine(100.0, 0.4, 31.0),
        RunningLine(73.6, 0.07, 5.1),
    )
    for line in lines:
        amplitude[np.abs(lines_hz - line.frequency_hz) < 0.6] = line.rms
    spectrum = Spectrum(lines_hz, amplitude, "rms", "acceleration", "m/s^2", 0.75)
    picture = RunningPicture(spectrum, lines, 3.42, 2.0, 200.0, velocity_rms_m_per_s=0.0124)
    return RunningReading("running.flac", 400.0, 1, 30.0, picture, RUN_ENTRY)


PARAMETERS = (
    ParameterReading(
        "support 2 vertical", "N/m", 1.2e7, 7.0e5, 2.0e8, 3.1e6, 2.2e6, 4.4e6, informed=True
    ),
    ParameterReading(
        "support 3 rotation", "N m/rad", 4e5, 2e4, 8e6, 3.6e5, 3e4, 6e6, informed=False
    ),
    ParameterReading("check valve mass", "kg", 24.0, 20.0, 28.0, 25.1, 22.4, 27.9, informed=True),
)
MATCH = Match(
    measured=MODES,
    pairs=(
        Pair(1, MODES[0], 27.9, 23.4, 23.1, 23.7, "vertical", 24.6),
        Pair(2, MODES[1], 30.2, 31.8, 30.9, 32.6, "lateral", None),
    ),
    unpaired=(MODES[2],),
    parameters=PARAMETERS,
    ensemble=Ensemble(("a", "b", "c"), np.zeros((4, 3)), np.full(4, 0.25)),
    tapped_modes=(
        ModelMode(23.4, 23.1, 23.7, "vertical", 1.9),
        ModelMode(31.8, 30.9, 32.6, "lateral", 1.9),
    ),
    next_measurement="Tap laterally at 4.9 m: it would tell how stiff the nozzle turns.",
)


def _after(*medians: float) -> tuple[JudgedMode, ...]:
    directions = ("vertical", "lateral", "vertical", "lateral")
    return tuple(
        JudgedMode(hz, 0.95 * hz, 1.05 * hz, direction, 0.99)
        for hz, direction in zip(medians, directions, strict=False)
    )


FIXES = (
    Verdict(
        1, "support", "Add a clamp at 1.6 m, 4 MN/m both ways", AddSupport(1.6, 4e6, 4e6),
        _after(66.4, 71.9, 124.0), Nearest("pump 2x", 0.33), 0.97,
        ("holds back 1.2 mm of thermal growth at 1.6 m", "fails below 2.6 MN/m"),
    ),
    Verdict(
        2, "stiffen", "Stiffen support 2 to 20 MN/m vertical", StiffenSupport(1, 2e7),
        _after(36.2, 37.4, 93.0), Nearest("pump 2x", 0.25), 0.78,
        ("steel behind the clamp must be as stiff",),
    ),
    Verdict(
        3, "mass", "Add 18 kg at 2.0 m", AddMass(2.0, 18.0),
        _after(17.1, 19.0, 80.2), Nearest("pump 1x", 0.21), 0.41,
        ("adds 26 % of the span's mass",),
    ),
)  # fmt: skip
DETUNING = Detuning(
    state="running",
    margin=0.2,
    bands=bands((PUMP, RIPPLE), 0.2),
    modes=(
        JudgedMode(20.9, 20.1, 21.8, "vertical", 0.04),
        JudgedMode(28.4, 27.2, 29.5, "lateral", 0.11),
        JudgedMode(79.2, 74.0, 84.8, "vertical", 0.55),
    ),
    chance_now=0.02,
    nearest_now=Nearest("pump 1x", 0.135),
    fixes=FIXES,
)


def workup(of: Job | None = None, **changes: object) -> Workup:
    """Everything computed for the job, as written above; recordings as the job names them."""
    of = of or job()
    taps = [replace(tap_reading(), entry=entry) for entry in of.recordings_of("tap")]
    running = [replace(running_reading(), entry=entry) for entry in of.recordings_of("running")]
    whole = Workup(
        job=of,
        taps=tuple(taps),
        evidence=EVIDENCE,
        running=tuple(running),
        match=MATCH,
        detuning=DETUNING,
        states=states(),
        findings=findings(of, running),
    )
    return replace(whole, **changes)  # type: ignore[arg-type]


def findings(of: Job, readings: Sequence[RunningReading]) -> Findings:
    """What the lines come to beside the modes as judged, and what else is to be said."""
    known = known_modes(MODES, DETUNING.modes, of.tapped, of.running)
    blow = Blow(
        4.9, "lateral", "tapped", 0.042, 0.018, "the natural frequencies in the running state",
        (Expected(28.9, 33.4, "lateral", 0.93),),
    )  # fmt: skip
    stray = Contradiction(
        "peak", MODES[2].frequency_hz, "vertical",
        "the peak belongs to no computed mode: a line joined to this one may ring there",
        "move the sensor along the pipe",
    )  # fmt: skip
    return Findings(running_findings(of, readings, known), (), (blow,), (stray,), sentence([blow]))


def states() -> tuple[StateModes, ...]:
    """Computed modes as half waves, so that no solver is needed."""
    stations = np.linspace(0.0, SPAN.length_m, 41)
    estimate = HandbookEstimate(
        24.4, 12.7, 27.4, "f = b^2/(2 pi L^2) sqrt(EI/m), b = 3.92", "made up for this test", ""
    )
    found = []
    for state, factor in (("tapped", 1.1), ("running", 1.0)):
        modes = tuple(
            Mode(factor * hz, direction, 1.9, stations, _half_waves(stations, axis, number))
            for number, (hz, direction, axis) in enumerate(
                ((20.9, "vertical", 2), (28.4, "lateral", 1), (79.2, "vertical", 2)), start=1
            )
        )
        found.append(StateModes(state, modes, estimate))
    return tuple(found)


def _half_waves(stations: np.ndarray, axis: int, number: int) -> np.ndarray:
    shape = np.zeros((len(stations), 3))
    shape[:, axis] = np.sin(number * math.pi * stations / stations[-1])
    return shape
