"""Screening of a calibrated vibration level against published lines, each with its source.

A screening says whether a closer look is called for, never that a pipe may stay as it is: the
sensor sees one station and one direction, a stress concentration is not seen at all.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from fieldkit.detune import severity_lines as lines_of
from fieldkit.detune.velocity_stress import carried_mass_ratio, stress_per_velocity
from fieldkit.span.layout import Span, State

SCREENING_CAUTION = (
    "Screening only, from one place and direction: a level below a line proves nothing about the "
    "rest of the pipe; the responsible piping engineer decides under the local code."
)
STRESSED_STEEL = "carbon steel"


@dataclass(frozen=True)
class LineLevel:
    """One running line as velocity."""

    frequency_hz: float
    rms_m_per_s: float


@dataclass(frozen=True)
class Level:
    """What a calibrated running record says of the velocity."""

    lines: tuple[LineLevel, ...]
    overall_rms_m_per_s: float
    low_hz: float
    high_hz: float

    @property
    def peak_m_per_s(self) -> float:
        """Zero to peak, as if all lines peaked at once; that of a sine of the level at least."""
        together = sum(line.rms_m_per_s for line in self.lines)
        return math.sqrt(2) * max(self.overall_rms_m_per_s, together)


@dataclass(frozen=True)
class Limit:
    """A named line of a criterion, in the unit of its screening."""

    name: str
    value: float


@dataclass(frozen=True)
class Screening:
    """One criterion applied to one record."""

    criterion: str
    value: float
    unit: str
    measure: str
    """``rms``, ``zero to peak`` or ``peak to peak``."""
    limits: tuple[Limit, ...]
    """Rising; empty where only the value is told."""
    above: tuple[str, ...]
    """Names of the limits that the value exceeds."""
    at_hz: float | None
    """The line that decides; None for a level over all frequencies."""
    applies_to: str
    source: str
    from_memory: bool
    """Whether the figures are quoted without the publication at hand."""
    note: str = ""


def screenings(
    level: Level,
    span: Span | None,
    state: State | None,
    first_mode_hz: float | None = None,
) -> tuple[Screening, ...]:
    """Every criterion that this level can be held against; those of the pipe need its span.

    ``first_mode_hz`` is the lowest natural frequency as it runs, where it is known.
    """
    found: list[Screening | None] = []
    if span is not None and state is not None:
        found.append(_stress(level, span, state))
        found.append(_om3(level, span, state, first_mode_hz))
    found += [_guideline(level), _iso(level), _api618(level)]
    return tuple(one for one in found if one is not None)


def _above(value: float, limits: Sequence[Limit]) -> tuple[str, ...]:
    return tuple(limit.name for limit in limits if value > limit.value)


def _stress(level: Level, span: Span, state: State) -> Screening:
    steel = span.material.name == STRESSED_STEEL
    limits = (Limit("endurance line", lines_of.NOMINAL_STRESS_PA),) if steel else ()
    value = level.peak_m_per_s * stress_per_velocity(span, state)
    masses = ", ".join(mass.name for mass in span.masses)
    note = "nominal bending stress, stress concentration of 5 and safety factor of 2 in the line"
    if not steel:
        note = f"nominal bending stress; no line for {span.material.name} is known here"
    if masses:
        note += f"; not covered: concentrated masses ({masses}) raise the stress above this"
    return Screening(
        "velocity-stress",
        value,
        "Pa",
        "zero to peak",
        limits,
        _above(value, limits),
        None,
        "straight uniform spans in their first mode, with contents and insulation",
        "computed from the mode shapes; endurance 13 000 psi, factors 5 and 2: Wachel, Morton and "
        "Atkins 1990, Proc. 19th Turbomachinery Symposium, 119",
        True,
        note,
    )


def _om3(level: Level, span: Span, state: State, first_mode_hz: float | None) -> Screening:
    strongest = max(level.lines, key=lambda line: line.rms_m_per_s, default=None)
    forced_below = 1.0
    if strongest is not None and first_mode_hz is not None:
        forced_below = max(1.0, first_mode_hz / strongest.frequency_hz)
    allowed = lines_of.om3_velocity(carried_mass_ratio(span, state), forced_below)
    limits = (Limit("screening velocity", allowed),)
    material = span.material.name
    other = "" if material == STRESSED_STEEL else f"; of carbon steel, this pipe is {material}"
    return Screening(
        "ASME OM part 3 style velocity",
        level.peak_m_per_s,
        "m/s",
        "zero to peak",
        limits,
        _above(level.peak_m_per_s, limits),
        None,
        "steady vibration of piping",
        "ASME OM-S/G part 3, simplified method",
        True,
        f"C1 0.15, C4 0.7, C2 K2 4; C3 of this pipe with contents and insulation{other}",
    )


def _worst_line(
    level: Level, low_hz: float, high_hz: float, line_of: Callable[[float], float]
) -> LineLevel | None:
    """The line that comes highest relative to a limit, within the range of the limit."""
    covered = [line for line in level.lines if low_hz <= line.frequency_hz <= high_hz]
    return max(
        covered, key=lambda line: line.rms_m_per_s / line_of(line.frequency_hz), default=None
    )


def _guideline(level: Level) -> Screening | None:
    worst = _worst_line(level, *lines_of.GUIDELINE_HZ, lines_of.concern_m_per_s)
    if worst is None:
        return None
    limits = (
        Limit("concern", lines_of.concern_m_per_s(worst.frequency_hz)),
        Limit("problem", lines_of.problem_m_per_s(worst.frequency_hz)),
    )
    return Screening(
        "process pipework guideline",
        worst.rms_m_per_s,
        "m/s",
        "rms",
        limits,
        _above(worst.rms_m_per_s, limits),
        worst.frequency_hz,
        "process pipework, 1 to 300 Hz, line by line",
        "Energy Institute, Guidelines for the avoidance of vibration induced fatigue failure in "
        "process pipework, 2nd ed. 2008",
        True,
    )


def _iso(level: Level) -> Screening:
    value = level.overall_rms_m_per_s
    limits = tuple(Limit(f"zone {n}", v) for n, v in lines_of.ISO_ZONES_M_PER_S.items())
    return Screening(
        "ISO 20816-8 zones, dampers and piping",
        value,
        "m/s",
        "rms",
        limits,
        _above(value, limits),
        None,
        "reciprocating compressor systems only, 120 to 1800 r/min",
        "ISO 20816-8:2018, overall velocity 2 to 1000 Hz",
        True,
        f"here of {level.low_hz:g} to {level.high_hz:g} Hz",
    )


def _api618(level: Level) -> Screening | None:
    worst = _worst_line(level, 0.0, lines_of.API618_HIGHEST_HZ, lines_of.api618_velocity)
    if worst is None:
        return None
    value = 2 * math.sqrt(2) * worst.rms_m_per_s
    limits = (Limit("design line", lines_of.api618_velocity(worst.frequency_hz)),)
    return Screening(
        "API 618 design line",
        value,
        "m/s",
        "peak to peak",
        limits,
        _above(value, limits),
        worst.frequency_hz,
        "piping of reciprocating compressors, up to 200 Hz, line by line",
        "API 618, 5th edition",
        True,
        "0.5 mm peak to peak below 10 Hz, 32 mm/s peak to peak above",
    )
