"""What is known of the natural frequencies in the running state, from taps and from the model."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Protocol

from fieldkit.detune.evidence import RUNNING
from fieldkit.detune.magnification import Doubtful
from fieldkit.signal.modes import MeasuredMode
from fieldkit.span.layout import State

MEASURED = "measured"
SEEN_RUNNING = "seen running"
COMPUTED = "computed"
DESCRIBED = "by its description"
"""Computed where nothing was measured: supports as they usually are."""

ASSUMED_DAMPING = (0.001, 0.05)
"""Where none was measured: bare welded pipe to insulated pipe on many supports, at vibration
amplitudes (from memory)."""
TAP_TO_RUNNING = 0.003
"""A mode runs at another amplitude than it was tapped at: its frequency is not known better than
this, relative (common practice, no source)."""
DAMPING_DOUBT = 0.3
"""Relative sd of a damping that came without one."""
LEAST_DAMPING_DOUBT = 0.05
SAME_MODE = 0.03
"""A computed mode this near to a measured one of its direction is that one."""


class Spread(Protocol):
    """A computed mode over the ensemble."""

    @property
    def median_hz(self) -> float:
        """Median."""

    @property
    def low_hz(self) -> float:
        """5 %."""

    @property
    def high_hz(self) -> float:
        """95 %."""

    @property
    def direction(self) -> str:
        """Where it moves most."""


@dataclass(frozen=True)
class KnownMode:
    """A natural frequency of the pipe as it runs."""

    frequency: Doubtful
    damping: Doubtful
    direction: str | None
    origin: str
    """MEASURED, SEEN_RUNNING, COMPUTED or DESCRIBED."""
    damping_measured: bool

    @property
    def hz(self) -> float:
        """Its best value."""
        return self.frequency.median

    @property
    def computed(self) -> bool:
        """Whether only the model says so."""
        return self.origin in (COMPUTED, DESCRIBED)


def alike(tapped: State, running: State) -> bool:
    """Whether a mode measured as tapped is the one the pipe runs with."""
    same_fill = tapped.fill == running.fill and running.fill[0] == running.fill[1]
    return (
        same_fill
        and abs(tapped.temperature_k - running.temperature_k) < 10.0
        and tapped.pressure_pa == running.pressure_pa
    )


def known_modes(
    measured: Sequence[MeasuredMode],
    computed: Sequence[Spread],
    tapped: State,
    running: State,
) -> tuple[KnownMode, ...]:
    """Modes of the running state in rising frequency: measured where they can be, else computed."""
    same = alike(tapped, running)
    valid = [mode for mode in measured if same or mode.state == running.name]
    firm = [_measured(mode) for mode in valid if mode.source != RUNNING]
    seen = [_measured(mode) for mode in valid if mode.source == RUNNING]
    known = firm + [mode for mode in seen if not _among(firm, mode.hz, mode.direction)]
    known += [
        _computed(mode, measured)
        for mode in computed
        if not _among(known, mode.median_hz, mode.direction)
    ]
    return tuple(sorted(known, key=lambda mode: mode.hz))


def computed_modes(
    measured: Sequence[MeasuredMode], computed: Sequence[Spread]
) -> tuple[KnownMode, ...]:
    """Modes that only the model knows, as after a change; damping is carried over from the taps."""
    return tuple(_computed(mode, measured) for mode in computed)


def _measured(mode: MeasuredMode) -> KnownMode:
    running = mode.source == RUNNING
    least = 1e-4 if running or mode.state == "running" else TAP_TO_RUNNING
    sd_hz = max(mode.frequency_sd_hz, least * mode.frequency_hz)
    damping, stated = _damping([mode])
    origin = SEEN_RUNNING if running else MEASURED
    frequency = Doubtful.about(mode.frequency_hz, sd_hz)
    return KnownMode(frequency, damping, mode.direction, origin, stated)


def _computed(mode: Spread, measured: Sequence[MeasuredMode]) -> KnownMode:
    """Damping is carried over from the measured mode of its direction that is nearest in ratio."""
    low = min(mode.low_hz, 0.999 * mode.median_hz)
    high = max(mode.high_hz, 1.001 * mode.median_hz)
    spread = Doubtful.between(low, high).sd_ln
    own = [m for m in measured if m.direction in (mode.direction, None)] or list(measured)
    nearest = sorted(own, key=lambda m: abs(m.frequency_hz / mode.median_hz - 1))
    damping, stated = _damping(nearest)
    origin = COMPUTED if measured else DESCRIBED
    return KnownMode(Doubtful(mode.median_hz, spread), damping, mode.direction, origin, stated)


def _damping(candidates: Iterable[MeasuredMode]) -> tuple[Doubtful, bool]:
    """Of the first that has one, by taps before running records; else what pipes usually have."""
    stated = [(m.source == RUNNING, m.damping_ratio, m.damping_sd) for m in candidates]
    known = [(late, ratio, sd) for late, ratio, sd in stated if ratio]
    if not known:
        return Doubtful.between(*ASSUMED_DAMPING), False
    _, value, sd = min(known, key=lambda one: one[0])
    doubt = DAMPING_DOUBT if sd is None else max(sd / value, LEAST_DAMPING_DOUBT)
    return Doubtful(value, doubt), True


def _among(known: Sequence[KnownMode], hz: float, direction: str | None) -> bool:
    return any(
        abs(mode.hz / hz - 1) <= SAME_MODE and (mode.direction in (direction, None))
        for mode in known
    )
