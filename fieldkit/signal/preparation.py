"""From tap records to traces: one analysis rate, the background's noise and its steady lines."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.background import NoiseDensity, noise_density
from fieldkit.signal.decimation import decimate
from fieldkit.signal.scan import Region
from fieldkit.signal.surplus import background_surplus
from fieldkit.signal.tones import (
    Line,
    background_lines,
    dies_away,
    swing,
    wandering_density,
    wanders,
)
from fieldkit.signal.traces import Component, Trace, residual

Real = NDArray[np.float64]

_RATE_OVER_REPORTED = 24.0
_ANALYSED_OVER_REPORTED = 3.0
_SEARCHED_BELOW = 0.5
_SLOW_OVER_REPORTED = 1.25
_USABLE_OF_RATE = 0.45
_LEAST_BACKGROUND_S = 0.5
_LONGEST_BACKGROUND_S = 30.0
_FAR_LOWER = 0.5
_RANGE_DB = 100.0
"""Noise is never taken as lower than this below the peak of the trace."""


class Record(Protocol):
    """What is needed of a tap record."""

    @property
    def samples(self) -> Real:
        """(n,) free decay."""

    @property
    def rate_hz(self) -> float:
        """Samples a second."""

    @property
    def background(self) -> Real:
        """(m,) samples without a blow."""


@dataclass(frozen=True)
class Prepared:
    """Everything the search starts from."""

    traces: tuple[Trace, ...]
    lines: tuple[Line, ...]
    region: Region
    has_background: bool
    quiets: tuple[Trace | None, ...] = ()
    """The different backgrounds at the analysis rate."""

    def surplus(self, part: Component) -> float:
        """What the backgrounds hold where a component stands, over the noise it was judged by."""
        longest = max(t.duration_s for t in self.traces)
        width_hz = max(part.half_power_hz, 1 / longest)
        noise, at_hz = self.traces[0].noise, part.frequency_hz
        found = [background_surplus(q, self.lines, noise, at_hz, width_hz) for q in self.quiets]
        return float(np.mean(found)) if found else 1.0

    def with_noise_from(self, parts: Sequence[Component]) -> Prepared:
        """Noise density read anew from what the components leave."""
        traces = []
        for tap, trace in enumerate(self.traces):
            left = residual(trace, tap, parts)
            noise = noise_density([left], trace.rate_hz, whole=True, top_hz=self.region.high_hz)
            fresh = floored(noise, trace.samples, trace.rate_hz)
            traces.append(replace(trace, noise=fresh))
        return replace(self, traces=tuple(traces))


def prepare(records: Sequence[Record], low_hz: float, high_hz: float) -> Prepared:
    """Traces at the analysis rate; the region reaches from half to three times the reported range.

    A strong mode just above the range would spoil the fit of those inside it.
    """
    top_hz = min(
        _ANALYSED_OVER_REPORTED * high_hz, min(_USABLE_OF_RATE * r.rate_hz for r in records)
    )
    lowered = [lower(r.samples - rest(r), r.rate_hz, high_hz, top_hz) for r in records]
    grounds = {
        key: ground(*quiet_stretch(record, high_hz, top_hz), top_hz)
        for key, record in {id(r.background): r for r in records}.items()
    }
    traces = tuple(
        Trace(samples, rate_hz, trace_noise(grounds[id(r.background)], samples, rate_hz, top_hz))
        for r, (samples, rate_hz) in zip(records, lowered, strict=True)
    )
    longest = max(t.duration_s for t in traces)
    region = Region(
        max(1 / longest, _SEARCHED_BELOW * low_hz),
        top_hz,
        1.5 / longest,
        min(_SLOW_OVER_REPORTED * high_hz, top_hz),
    )
    lines = distinct([g.lines for g in grounds.values()])
    has_background = all(g.noise is not None for g in grounds.values())
    quiets = tuple(g.trace for g in grounds.values())
    return Prepared(traces, lines, region, has_background, quiets)


@dataclass(frozen=True)
class Ground:
    """What a stretch without a blow says: its noise and the lines in it."""

    noise: NoiseDensity | None
    lines: tuple[Line, ...] = ()
    wandering: NoiseDensity | None = None
    """Density of the lines that wander."""
    trace: Trace | None = None
    """The stretch itself."""


def ground(samples: Real, rate_hz: float, top_hz: float) -> Ground:
    """Noise and lines of a background; nothing where it is too short."""
    noise = noise_density([samples], rate_hz, top_hz=top_hz)
    if noise is None:
        return Ground(None)
    trace = Trace(samples, rate_hz, floored(noise, samples, rate_hz))
    found = background_lines(samples, rate_hz, noise, top_hz)
    lasting = [line for line in found if not dies_away(line, trace)]
    lines = tuple(replace(line, wanders=wanders(line, trace)) for line in lasting)
    density = wandering_density(lines, trace)
    told = (replace(line, amplitude=swing(line, trace)) if line.wanders else line for line in lines)
    return Ground(noise, tuple(told), density, trace)


def rest(record: Record) -> float:
    """What the sensor reads at rest."""
    quiet = record.background if len(record.background) > 0 else record.samples
    return float(np.mean(quiet))


def lower(samples: Real, rate_hz: float, high_hz: float, top_hz: float) -> tuple[Real, float]:
    """Samples at the analysis rate."""
    return decimate(
        np.asarray(samples, float),
        rate_hz,
        keep_hz=top_hz,
        wanted_rate_hz=_RATE_OVER_REPORTED * high_hz,
    )


def quiet_stretch(record: Record, high_hz: float, top_hz: float) -> tuple[Real, float]:
    """The background at the analysis rate: its last part, empty where it is too short to use."""
    samples = record.background[-int(_LONGEST_BACKGROUND_S * record.rate_hz) :] - rest(record)
    if len(samples) < _LEAST_BACKGROUND_S * record.rate_hz:
        return np.zeros(0), record.rate_hz
    return lower(samples, record.rate_hz, high_hz, top_hz)


def trace_noise(quiet: Ground, samples: Real, rate_hz: float, top_hz: float) -> NoiseDensity:
    """The background's density; where that between the lines of the trace is far lower, this one.

    A background that still rings from an earlier blow would hide the very modes that ring in it.
    """
    known, own = quiet.noise, noise_density([samples], rate_hz, whole=True, top_hz=top_hz)
    if known is None or own is None:
        return floored(known or own, samples, rate_hz)
    density = known.at(own.frequency_hz)
    lower = np.where(own.density < _FAR_LOWER * density, own.density, density)
    return floored(replace(own, density=lower), samples, rate_hz).with_lines(quiet.wandering)


def floored(noise: NoiseDensity | None, samples: Real, rate_hz: float) -> NoiseDensity:
    """A density that is nowhere below the range of any sensor."""
    least_rms = float(np.abs(samples).max(initial=0.0)) * 10 ** (-_RANGE_DB / 20)
    least = max(least_rms**2 / (rate_hz / 2), 1e-280)
    if noise is None:
        return NoiseDensity(np.array([1.0, rate_hz / 2]), np.full(2, least))
    return replace(noise, density=np.maximum(noise.density, least))


def distinct(found: Sequence[Sequence[Line]]) -> tuple[Line, ...]:
    """Lines of several backgrounds, those of the same frequency once."""
    out: list[Line] = []
    for line in (line for lines in found for line in lines):
        if all(abs(line.frequency_hz - o.frequency_hz) > line.resolution_hz for o in out):
            out.append(line)
    return tuple(out)
