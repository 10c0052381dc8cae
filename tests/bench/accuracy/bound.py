"""The Cramér-Rao bound of frequency and damping, all modes and taps of a recording together.

Poles are shared by the taps, amplitude and phase of every mode are free in each. Steady tones run
through background and taps with one amplitude, phase and frequency; tones that wander are free in
each stretch. Noise is weighted by its density at the frequency of each component, which is exact in
white noise and, elsewhere, where the density changes little over a bandwidth. Yao & Pandit 1995,
IEEE Trans. Signal Processing 43 (from memory), treat one mode of one tap.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from tests.bench.accuracy.recordings import Simulated, TrueMode
from tests.bench.accuracy.sums import power_sums

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True)
class ModeBound:
    """What is known at best about one mode."""

    frequency_sd_hz: float
    damping_sd: float
    energy_db: float
    """Sum of squares of its decays over the noise variance, at its frequency, all taps."""


@dataclass(frozen=True)
class Stretch:
    """Part of a recording: a free decay, or the background (no amplitudes)."""

    start: int
    count: int
    amplitudes: Complex
    """(modes,) at the first sample."""


@dataclass(frozen=True)
class Line:
    """A tone of the bound: its pole, whether it is one and the same in all stretches."""

    frequency_hz: float
    coherent: bool


def recording_bound(made: Simulated) -> tuple[ModeBound, ...]:
    """Bounds of the modes of a recording from its usable taps, scatter of the poles included."""
    first, past = made.background
    taps = [Stretch(b.start, b.end - b.start, b.amplitudes) for b in made.usable]
    quiet = [Stretch(first, past - first, np.zeros(0))] if past - first > 64 else []
    lines = [Line(t.frequency_hz, t.wander == 0) for t in made.tones if t.frequency_hz]
    lines = [line for line in lines if line.frequency_hz < 0.45 * made.rate_hz]
    density = made.density.at(np.array([m.frequency_hz for m in made.modes]))
    near = made.density.at(np.array([line.frequency_hz for line in lines]))
    bounds = mode_bounds(made.modes, taps, made.rate_hz, density, lines, near, quiet)
    return tuple(
        widened(bound, mode, taps, made.scatter, j)
        for j, (bound, mode) in enumerate(zip(bounds, made.modes, strict=True))
    )


def widened(
    bound: ModeBound,
    mode: TrueMode,
    taps: Sequence[Stretch],
    scatter: tuple[float, float],
    j: int,
) -> ModeBound:
    """The bound where each tap has its own pole about the true one."""
    share = np.array([abs(t.amplitudes[j]) ** 2 for t in taps])
    share = np.maximum(share / share.sum(), 1e-12)

    def mean_sd(sd: float, spread: float) -> float:
        return float(1 / np.sqrt(np.sum(1 / (sd**2 / share + spread**2))))

    return ModeBound(
        mean_sd(bound.frequency_sd_hz, scatter[0] * mode.frequency_hz),
        mean_sd(bound.damping_sd, scatter[1] * mode.damping_ratio),
        bound.energy_db,
    )


def mode_bounds(
    modes: Sequence[TrueMode],
    taps: Sequence[Stretch],
    rate_hz: float,
    density: Real,
    lines: Sequence[Line] = (),
    line_density: Sequence[float] | Real = (),
    quiet: Sequence[Stretch] = (),
) -> tuple[ModeBound, ...]:
    """Bounds of modes in noise of the given one-sided densities at modes and tones."""
    if not modes:
        return ()
    variance = np.concatenate([density, line_density]) * rate_hz / 2
    energy = np.zeros(len(modes))
    shared = 2 * len(modes) + 4 * sum(line.coherent for line in lines)
    information = np.zeros((shared, shared))
    for stretch in (*quiet, *taps):
        gram = products(modes, lines, stretch, rate_hz, variance)
        known, free = columns(modes, lines, stretch, rate_hz)
        information += eliminated(
            known.T @ gram @ known, known.T @ gram @ free, free.T @ gram @ free
        )
    for stretch in taps:
        for j, mode in enumerate(modes):
            energy[j] += decay_energy(mode, stretch, j, rate_hz) / variance[j]
    scale = np.sqrt(np.maximum(np.diag(information), 1e-300))
    covariance = np.linalg.pinv(information / np.outer(scale, scale), rcond=1e-13, hermitian=True)
    sd = np.sqrt(np.maximum(np.diag(covariance), 0)) / scale
    return tuple(
        ModeBound(float(sd[2 * j]), float(sd[2 * j + 1]), float(10 * np.log10(energy[j] + 1e-30)))
        for j in range(len(modes))
    )


def decay_energy(mode: TrueMode, stretch: Stretch, j: int, rate_hz: float) -> float:
    """Sum of squares of one mode over a stretch."""
    c = stretch.amplitudes[j]
    poles = np.array([2 * mode.pole.real, 2 * mode.pole]) / rate_hz
    even, odd = power_sums(poles, stretch.count)[0]
    return float(np.real(c * np.conj(c) * even + c * c * odd)) / 2


def products(
    modes: Sequence[TrueMode],
    lines: Sequence[Line],
    stretch: Stretch,
    rate_hz: float,
    variance: Real,
) -> Real:
    """Inner products of Re z^n, Re i z^n, Re t z^n, Re i t z^n of all modes and tones, weighted."""
    poles = np.array([m.pole for m in modes] + [2j * np.pi * line.frequency_hz for line in lines])
    poles = poles / rate_hz
    straight = power_sums(poles[:, None] + poles[None, :], stretch.count)
    crossed = power_sums(poles[:, None] + poles.conj()[None, :], stretch.count)
    time = 1 / rate_hz
    weight = 1 / np.sqrt(np.outer(variance, variance))
    size = len(poles)
    out = np.empty((size, 4, size, 4))
    for a, (beta, k) in enumerate(ELEMENTS):
        for b, (other, m) in enumerate(ELEMENTS):
            whole = beta * other * straight[k + m] + beta * np.conj(other) * crossed[k + m]
            out[:, a, :, b] = np.real(whole) / 2 * weight * time ** (k + m)
    return out.reshape(4 * size, 4 * size)


ELEMENTS = ((1.0 + 0j, 0), (1j, 0), (1.0 + 0j, 1), (1j, 1))


def columns(
    modes: Sequence[TrueMode], lines: Sequence[Line], stretch: Stretch, rate_hz: float
) -> tuple[Real, Real]:
    """Derivatives by shared and by free parameters, in the elements of each component."""
    coherent = [line for line in lines if line.coherent]
    size = 4 * (len(modes) + len(lines))
    shared = np.zeros((size, 2 * len(modes) + 4 * len(coherent)))
    free: list[Real] = []
    struck = len(stretch.amplitudes) > 0
    for j, mode in enumerate(modes):
        if struck:
            shared[4 * j : 4 * j + 4, 2 * j : 2 * j + 2] = by_pole(mode, stretch.amplitudes[j])
            free += [unit(size, 4 * j), unit(size, 4 * j + 1)]
    place = 2 * len(modes)
    for i, line in enumerate(lines):
        at = 4 * (len(modes) + i)
        if line.coherent:
            shared[at : at + 4, place : place + 4] = carried(line, stretch.start / rate_hz)
            place += 4
        else:
            free += [unit(size, at + k) for k in range(4)]
    return shared, np.array(free).T if free else np.zeros((size, 0))


def by_pole(mode: TrueMode, amplitude: complex) -> Real:
    """(4, 2) derivatives of Re c e^(pole t) by frequency and damping ratio, in elements."""
    natural, ratio = 2 * np.pi * mode.frequency_hz, mode.damping_ratio
    root = np.sqrt(1 - ratio**2)
    by_frequency = 2 * np.pi * complex(-ratio, root)
    by_ratio = natural * complex(-1.0, -ratio / root)
    slopes = amplitude * np.array([by_frequency, by_ratio])
    return np.stack([np.zeros(2), np.zeros(2), slopes.real, slopes.imag])


def carried(line: Line, start_s: float) -> Real:
    """(4, 4) elements about the start of a recording in elements about the start of a stretch."""
    turn = np.exp(2j * np.pi * line.frequency_hz * start_s)
    out = np.zeros((4, 4))
    for column, (beta, k) in enumerate(ELEMENTS):
        value = beta * turn
        out[2 * k : 2 * k + 2, column] = value.real, value.imag
        if k:
            out[0:2, column] = start_s * value.real, start_s * value.imag
    return out


def unit(size: int, at: int) -> Real:
    out = np.zeros(size)
    out[at] = 1.0
    return out


def eliminated(shared: Real, mixed: Real, free: Real) -> Real:
    """Information about shared parameters when the free ones are unknown."""
    if not free.size:
        return shared
    scale = np.sqrt(np.maximum(np.diag(free), 1e-300))
    inverse = np.linalg.pinv(free / np.outer(scale, scale), rcond=1e-12, hermitian=True)
    left = mixed / scale
    return shared - left @ inverse @ left.T
