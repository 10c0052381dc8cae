"""Resonance or forced: each strong running line held beside the modes of the pipe.

A line within ``margin_measured`` of a mode is called a resonance, within ``margin`` near one, and
beyond it forced; the doubts of line, mode and damping decide how sure that is. The two margins are
those of API 618, 5th edition, as two secondary texts give them: 10 % from the excitation on the
actual machine, 20 % as predicted.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace

from fieldkit.detune.excitation import Band, Excitation, Goal, bands, excitation_band
from fieldkit.detune.known_modes import DESCRIBED, MEASURED, KnownMode
from fieldkit.detune.magnification import Amplification, Doubtful, amplification

RESONANCE, NEAR, FORCED, CANNOT_TELL = "resonance", "near", "forced", "cannot tell"
VERDICTS = (RESONANCE, NEAR, FORCED, CANNOT_TELL)
SURE = 0.9
"""Chance from which a verdict is given."""
STRONG = 0.05
"""Lines below this share of the strongest one of their recording are left out."""
MOST_LINES = 6
SAME_FREQUENCY = 0.005
FAR_STRONGER = 2.0
WORTH_SAYING = 1.05
"""Ends of an interval that differ by more are told with the mode."""


@dataclass(frozen=True)
class Line:
    """A running line as the diagnosis needs it."""

    frequency_hz: float
    sd_hz: float
    rms: float
    unit: str
    steady: bool | None
    direction: str | None
    file: str = ""


@dataclass(frozen=True)
class Diagnosis:
    """What one running line is, and why."""

    line: Line
    excitation: str | None
    """The order it sits on."""
    mode: KnownMode | None
    """The nearest one that the sensor can see."""
    amplification: Amplification | None
    verdict: str
    """One of VERDICTS."""
    reason: str
    """One sentence that begins with the verdict."""
    measure_next: str

    @property
    def apart(self) -> float | None:
        """Distance of the mode from the line, relative to the line."""
        return abs(self.mode.hz / self.line.frequency_hz - 1) if self.mode else None


@dataclass(frozen=True)
class BandCheck:
    """A measured mode held against the excitation nearest to it, with the measured margin."""

    mode: KnownMode
    band: Band
    inside: bool


def strong(lines: Sequence[Line]) -> tuple[Line, ...]:
    """The lines of one recording worth a verdict, strongest first."""
    ranked = sorted(lines, key=lambda line: -line.rms)
    return tuple(line for line in ranked if line.rms >= STRONG * ranked[0].rms)[:MOST_LINES]


def diagnose(
    lines: Iterable[Line],
    modes: Sequence[KnownMode],
    excitations: Sequence[Excitation],
    goal: Goal,
) -> tuple[Diagnosis, ...]:
    """Every line with its order, its mode and its verdict, in the order given."""
    orders = bands(excitations, 0.0)
    return tuple(_diagnosed(line, modes, orders, goal) for line in lines)


def measured_in_bands(
    modes: Sequence[KnownMode], excitations: Sequence[Excitation], goal: Goal
) -> tuple[BandCheck, ...]:
    """Each measured mode beside its nearest excitation, kept clear by ``goal.margin_measured``."""
    kept = bands(excitations, goal.margin_measured)
    if not kept:
        return ()
    found = []
    for mode in modes:
        if not mode.computed:
            band = min(kept, key=lambda b: b.separation(mode.hz))
            found.append(BandCheck(mode, band, band.holds(mode.hz)))
    return tuple(found)


def worst(found: Sequence[Diagnosis]) -> Diagnosis | None:
    """The one to show first: a resonance, then one near it, then the strongest.

    A line that sits on an order and has a mode beside it goes before one that does not.
    """

    def place(one: Diagnosis) -> tuple[int, bool, bool, float]:
        first = {RESONANCE: 0, NEAR: 1}.get(one.verdict, 2)
        return first, one.excitation is None, one.mode is None, -one.line.rms

    return min(found, key=place, default=None)


def with_stronger(found: Diagnosis, others: Iterable[Line]) -> Diagnosis:
    """A forced line that a sensor in another direction reads far stronger is looked for there."""
    line = found.line
    same = [
        other
        for other in others
        if other.unit == line.unit
        and other.direction not in (line.direction, None)
        and abs(other.frequency_hz / line.frequency_hz - 1) <= SAME_FREQUENCY
    ]
    stronger = max(same, key=lambda other: other.rms, default=None)
    if found.verdict != FORCED or stronger is None or stronger.rms < FAR_STRONGER * line.rms:
        return found
    times = figure(stronger.rms / line.rms)
    what = f"see the {stronger.direction} sensor, which reads this line {times} times stronger"
    return replace(found, measure_next=what)


def _diagnosed(
    line: Line, modes: Sequence[KnownMode], orders: Sequence[Band], goal: Goal
) -> Diagnosis:
    own = excitation_band(line.frequency_hz, orders)
    order = own.name if own else None
    sits = f"{line.frequency_hz:.1f} Hz sits on {order or 'no order the job names'}"
    unknown = _why_unknown(line, modes, goal)
    if unknown is not None:
        reason, measure_next = unknown
        words = f"Cannot tell: {sits}; {reason}"
        return Diagnosis(line, order, None, None, CANNOT_TELL, words, measure_next)
    mode = _nearest(line, modes)
    found = amplification(
        Doubtful.about(line.frequency_hz, line.sd_hz), mode.frequency, mode.damping
    )
    if mode.origin == DESCRIBED:
        words = (
            f"Cannot tell: {sits}; nothing was measured on this pipe, and how stiff its supports "
            f"are decides where {_named(mode)} lies"
        )
        return Diagnosis(line, order, mode, None, CANNOT_TELL, words, _TAP_FIRST)
    verdict = _verdict(found, goal)
    if order is None and line.steady is not True and verdict != FORCED:
        level = "does not hold its level" if line.steady is False else "is hardly a line"
        words = (
            f"Cannot tell: {sits} and {level}: likely {_named(mode)} itself, stirred by flow or "
            "knocks"
        )
        return Diagnosis(line, None, mode, found, CANNOT_TELL, words, _STIRRED)
    words = f"{_HEADINGS[verdict]}: {sits}, {_beside(mode, found, verdict, goal)}"
    return Diagnosis(line, order, mode, found, verdict, words, _next(line, order, mode, verdict))


def _why_unknown(line: Line, modes: Sequence[KnownMode], goal: Goal) -> tuple[str, str] | None:
    """Reason and remedy where no mode can be named."""
    if line.frequency_hz > goal.up_to_hz:
        return (
            f"modes were looked for up to {goal.up_to_hz:g} Hz only",
            "raise up_to in [goal] above this line",
        )
    if not modes:
        return (
            "no natural frequency of this pipe as it runs is known",
            _TAP_FIRST,
        )
    if not _seen_by(line, modes):
        return (
            f"no mode was measured in {line.direction} direction",
            f"tap the pipe in {line.direction} direction",
        )
    return None


def _seen_by(line: Line, modes: Sequence[KnownMode]) -> list[KnownMode]:
    """Modes of the sensor's direction; all of them where a direction is not known."""
    if line.direction not in ("vertical", "lateral", "axial"):
        return list(modes)
    own = [mode for mode in modes if mode.direction in (line.direction, None)]
    return own or (list(modes) if any(mode.computed for mode in modes) else [])


def _nearest(line: Line, modes: Sequence[KnownMode]) -> KnownMode:
    return min(_seen_by(line, modes), key=lambda mode: abs(mode.hz / line.frequency_hz - 1))


def _verdict(found: Amplification, goal: Goal) -> str:
    """The verdict that is sure enough, the narrowest first."""
    if found.share_within(goal.margin_measured) >= SURE:
        return RESONANCE
    near = max(goal.margin, goal.margin_measured)
    within = found.share_within(near)
    if within >= SURE:
        return NEAR
    return FORCED if within <= 1 - SURE else CANNOT_TELL


_HEADINGS = {
    RESONANCE: "Resonance",
    NEAR: "Near resonance",
    FORCED: "Forced, off resonance",
    CANNOT_TELL: "Cannot tell",
}
_TAP_FIRST = "tap the pipe, best as it runs: full, warm and with the machine stopped"
_STIRRED = (
    "a tap in the same direction tells whether this is a mode; count it as one, not as a force"
)


def _beside(mode: KnownMode, found: Amplification, verdict: str, goal: Goal) -> str:
    apart = 100 * abs(1 / found.ratio - 1)
    times = f"amplified about {figure(found.best)} times{_interval(found)}"
    if not mode.damping_measured and verdict in (RESONANCE, NEAR, CANNOT_TELL):
        times += ", damping not measured"
    if verdict == FORCED:
        return f"{apart:.0f} % from {_named(mode)}, the nearest: {times}"
    if verdict == CANNOT_TELL:
        return (
            f"and {_named(mode)} is too uncertain to be put within or beyond "
            f"{100 * goal.margin:.0f} % of it: {times}"
        )
    return f"{apart:.1f} % from {_named(mode)}: {times}"


def _interval(found: Amplification) -> str:
    low, high = figure(found.low), figure(found.high)
    return "" if low == high else f" ({low} to {high})"


def _named(mode: KnownMode) -> str:
    direction = f"{mode.direction} " if mode.direction else ""
    notes = [] if mode.origin == MEASURED else [mode.origin]
    if mode.frequency.high > WORTH_SAYING * mode.frequency.low:
        notes.append(f"{mode.frequency.low:.1f} to {mode.frequency.high:.1f} Hz")
    said = f" ({', '.join(notes)})" if notes else ""
    return f"the {direction}mode at {mode.hz:.1f} Hz{said}"


def _next(line: Line, order: str | None, mode: KnownMode, verdict: str) -> str:
    if order is None:
        return (
            f"find what turns or pulsates at {line.frequency_hz:.1f} Hz: measure beside each "
            "machine, then name it as an [[excitation]]"
        )
    if verdict == FORCED:
        return (
            "look at the source: measure this line at the machine and at both ends of the span; "
            "balance, alignment, pulsation"
        )
    if verdict == CANNOT_TELL or mode.computed:
        direction = mode.direction or "each"
        return (
            f"tap in {direction} direction with the line as it runs, full and warm, the machine "
            "stopped"
        )
    return (
        "change the speed by a few per cent, where the operator allows it: a resonance falls "
        "steeply off its peak, a forced line does not"
    )


def figure(times: float) -> str:
    """An amplification to the digits it deserves."""
    return f"{times:.0f}" if times >= 9.95 else f"{times:.1f}"
