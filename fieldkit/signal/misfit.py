"""Decays that are not exactly exponential: how strongly their misfit stands around them.

A room, a support or a mixing desk turns a strong mode's decay into something that one exponential
explains to a few per cent only. What is left is proportional to the mode and stands near it, far
over the background; fitted as if it were noise of the background alone it draws in one component
after the other, none of them a mode. Here it is taken as noise: its density around each strong
mode is read from rings of frequency about it, by medians, so that a true neighbour, a narrow line
in a ring, does not raise it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.background import MEDIAN_OF_MEAN, NoiseDensity
from fieldkit.signal.leftovers import leftovers
from fieldkit.signal.scan import Candidate, Region, scan
from fieldkit.signal.search import FAR_WEAKER, NEARNESS, Found, add
from fieldkit.signal.traces import Component, Trace, decay_energy, residual

Real = NDArray[np.float64]

_ROUNDS = 8
_WITHIN = 4.0
"""Bandwidths about a mode inside which only what is nearly as strong stands for itself."""
_LEAST_WITHIN = 0.1
_LEAST_BINS = 5.0
_FARTHEST = 0.5
_STEP = 2**0.5
_OVER_NOISE = 2.0
"""Median of a ring over that of the noise known so far from which on it counts as misfit."""
_RINGS = 0.1
_STRONG = 1e3
"""Gain in twice the log-likelihood of a mode whose misfit can show."""


def searched_beside_misfit(
    traces: Sequence[Trace], tones: Sequence[Component], region: Region
) -> tuple[tuple[Trace, ...], Found]:
    """A search that takes what surrounds strong modes as noise; the traces with that noise."""
    found, heard = Found(tuple(tones), crowded=True), tuple(traces)
    for _ in range(_ROUNDS):
        coarse = leftovers(heard, found.parts, region)
        before = found.parts
        for candidate in own_lines(scan(coarse, region), found.parts, heard):
            found = add(heard, found, candidate, region)
        if found.parts is before:
            break
        heard = raised(traces, found.parts)
    return heard, found


def own_lines(
    candidates: Sequence[Candidate], parts: Sequence[Component], traces: Sequence[Trace]
) -> list[Candidate]:
    """Candidates that do not stand, too weak, about a known mode or a stronger candidate."""
    resolution_hz = 1 / max(t.duration_s for t in traces)
    known = [(p.pole, float(decay_energy(p, traces).sum())) for p in parts if not p.steady]
    out = []
    for one in candidates:
        at = np.array([one.pole.imag / (2 * np.pi)])
        density = np.mean([float(t.noise.at(at)[0]) for t in traces])
        energy = one.gain * float(density) / 2
        if all(energy > least_share(one.pole, pole, resolution_hz) * e for pole, e in known):
            known.append((one.pole, energy))
            out.append(one)
    return out


def least_share(pole: complex, strong: complex, resolution_hz: float) -> float:
    """Energy over that of a strong mode that a mode of its own has at least at this distance."""
    apart_hz = abs(pole.imag - strong.imag) / (2 * np.pi)
    width_hz = -(pole.real + strong.real) / np.pi + resolution_hz
    if apart_hz < _WITHIN * width_hz:
        return _LEAST_WITHIN
    return FAR_WEAKER if apart_hz < NEARNESS * strong.imag / (2 * np.pi) else 0.0


def raised(traces: Sequence[Trace], parts: Sequence[Component]) -> tuple[Trace, ...]:
    """The traces, their noise raised by the misfit of the strong ones among the parts."""
    modes = [p for p in parts if not p.steady and p.damping_ratio < _RINGS]
    out = []
    for tap, trace in enumerate(traces):
        left = residual(trace, tap, parts)
        power = np.abs(np.fft.rfft(left, trace.fast_whole)[1:]) ** 2
        power *= 2 / (trace.rate_hz * min(len(left), trace.fast_whole))
        noise = trace.noise
        energies = [float(decay_energy(p, traces)[tap]) for p in modes]
        for i in np.argsort(energies)[::-1]:
            at_hz = modes[i].frequency_hz
            if 2 * energies[i] > _STRONG * float(noise.at(np.array([at_hz]))[0]):
                noise = with_rings(noise, power, trace.rate_hz / trace.fast_whole, modes[i])
        out.append(replace(trace, noise=noise))
    return tuple(out)


def with_rings(
    noise: NoiseDensity, power: Real, spacing_hz: float, mode: Component
) -> NoiseDensity:
    """The density with what the rings about a mode hold beyond it, never rising outwards.

    ``power`` is the residual's one-sided density on bins from ``spacing_hz`` on.
    """
    centre_hz = mode.frequency_hz
    least = max(_LEAST_BINS * spacing_hz, mode.half_power_hz)
    count = int(np.log(max(_FARTHEST * centre_hz / least, 1.0)) / np.log(_STEP))
    if count < 2:
        return noise
    edges = least * _STEP ** np.arange(count + 1)
    levels = np.zeros(count)
    for i, (near, far) in enumerate(zip(np.r_[0.0, edges[1:-1]], edges[1:], strict=True)):
        bins = ring(centre_hz / spacing_hz, near / spacing_hz, far / spacing_hz, len(power))
        known = noise.at(np.asarray((bins + 1) * spacing_hz, float))
        ratio = float(np.median(power[bins] / known)) / MEDIAN_OF_MEAN if len(bins) else 0.0
        levels[i] = np.median(known) * (ratio - 1) if ratio > _OVER_NOISE else 0.0
    levels = np.maximum.accumulate(levels[::-1])[::-1]
    if not levels.any():
        return noise
    return with_bump(noise, centre_hz, np.sqrt(edges[:-1] * edges[1:]), levels)


def ring(centre: float, near: float, far: float, count: int) -> NDArray[np.int64]:
    """Bins, counted from 1 at index 0, no nearer to the centre than ``near`` and within ``far``."""
    low = np.arange(int(np.ceil(centre - far)), int(np.floor(centre - near)) + 1)
    high = np.arange(int(np.ceil(centre + near)), int(np.floor(centre + far)) + 1)
    bins = np.union1d(low, high) - 1
    return np.asarray(bins[(bins >= 0) & (bins < count)])


def with_bump(noise: NoiseDensity, centre_hz: float, radius_hz: Real, levels: Real) -> NoiseDensity:
    """The density plus levels that depend on the distance from a centre, flat inside the first."""
    spread = np.r_[0.0, radius_hz]
    grid = np.concatenate([centre_hz - spread[::-1], centre_hz + spread[1:]])
    fine_hz = np.union1d(noise.frequency_hz, grid[grid > 0])
    distance = np.abs(fine_hz - centre_hz)
    shown = np.log(np.maximum(levels, 1e-300))
    added = np.exp(np.interp(np.log(distance + 1e-9), np.log(radius_hz), shown))
    added = np.where((added > 1e-290) & (distance <= radius_hz[-1] * _STEP), added, 0.0)
    return NoiseDensity(fine_hz, noise.at(fine_hz) + added)
