"""Find the modes in the periodogram of a running record: subspace poles, refined and thinned."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.periodogram import Periodogram
from fieldkit.signal.stabilisation import StablePole, distinct, stabilised
from fieldkit.signal.subspace import bands, poles_by_order
from fieldkit.signal.whittle import (
    EXACT,
    ROUGH,
    SpectralFit,
    Zone,
    covariance_of,
    fit_zone,
    mode_columns,
)

Real = NDArray[np.float64]

EVIDENT = 30.0
"""Twice the gain in log-likelihood a mode has to bring; noise does so in 1 of 10^5 places."""
_NOTICED = 18.0
"""With less than this nobody would have taken it for a mode."""
_ZONE_WIDTHS = 10.0
_LEAST_ZONE_BINS = 24
_MOST_ZONE_BINS = 400
_WIDEST_ZONE = 0.4
_TOGETHER_WIDTHS = 2.0
_MOST_TOGETHER = 6
_PROMISING = 10.0
"""Quick gain from which a fit is worth its time; modes to be found reach 25 and more."""
_LOW_QUANTILE = 0.357
"""30 % quantile of an exponentially distributed value, over its mean."""
_LEAST_HITS = 4
_STANDS_OUT = 5.0


@dataclass(frozen=True)
class Stirred:
    """A component of the spectrum that looks like a mode stirred by random forces."""

    pole: complex
    """1/s"""
    amplitude: Real
    """(2,) of its peak and of the part that changes sign there."""
    covariance: Real
    """(2, 2) of omega and ln decay, from the Fisher information."""
    gain: float
    """Twice the log-likelihood it brings."""

    @property
    def frequency_hz(self) -> float:
        """Undamped natural frequency."""
        return float(abs(self.pole) / (2 * np.pi))

    @property
    def damping_ratio(self) -> float:
        """Share of critical damping."""
        return float(-self.pole.real / abs(self.pole))

    @property
    def width_hz(self) -> float:
        """Half-power bandwidth."""
        return float(-self.pole.real / np.pi)

    @property
    def mean_square(self) -> float:
        """Vibration power it holds: area under its peak."""
        return float(self.amplitude[0] * self.width_hz * np.pi / 2)


@dataclass(frozen=True)
class Searched:
    """What a periodogram holds."""

    modes: tuple[Stirred, ...]
    """In rising frequency."""
    unstable_hz: tuple[float, ...]
    """Peaks that too few model orders agree about."""
    faint_hz: tuple[float, ...]
    """Peaks that chance might make as well."""


def search(picture: Periodogram, low_hz: float, high_hz: float) -> Searched:
    """Every component between low and high that the likelihood bears out."""
    filled = picture.filled()
    poles = distinct(
        [
            pole
            for band in bands(low_hz, high_hz)
            for pole in stabilised(poles_by_order(filled, picture.step_hz, band))
        ]
    )
    stable = [p.pole for p in poles if p.stable]
    promising = [p for p in stable if quick_gain(picture, filled, p) > _PROMISING]
    modes, faint = _survivors(picture, promising)
    modes, _ = _survivors(picture, [m.pole for m in modes], modes, finished=EXACT)
    inside = [m for m in modes if low_hz <= m.frequency_hz <= high_hz]
    unstable = [p for p in poles if not p.stable and p.hits >= _LEAST_HITS]
    return Searched(
        tuple(sorted(inside, key=lambda m: m.frequency_hz)),
        tuple(_standing_out(unstable, picture, filled, modes)),
        tuple(f for f in faint if not _beside(f, modes)),
    )


def quick_gain(picture: Periodogram, filled: Real, pole: complex) -> float:
    """Twice the log-likelihood of a peak as high as it looks, on a flat floor, without a fit."""
    width = -pole.real / np.pi
    reach = max(6 * width, 12 * picture.step_hz)
    centre = pole.imag / (2 * np.pi)
    bins = np.arange(
        max(1, int((centre - reach) * picture.duration_s)),
        min(len(filled), int((centre + reach) * picture.duration_s) + 1),
    )
    power, distance = filled[bins], (bins * picture.step_hz - centre) / (width / 2)
    floor = float(np.quantile(power, 0.3)) / _LOW_QUANTILE
    inside = np.abs(distance) < max(1.0, 2 * picture.step_hz / width)
    height = (float(power[inside].mean()) if inside.any() else 0.0) - floor
    if height <= 0:
        return 0.0
    ratio = 1 + 1.2 * height / floor / (1 + distance**2)
    return float(2 * np.sum(power / floor * (1 - 1 / ratio) - np.log(ratio)))


def _standing_out(
    poles: Sequence[StablePole], picture: Periodogram, filled: Real, modes: Sequence[Stirred]
) -> list[float]:
    """Poles where the spectrum stands clear of what is around them."""
    found: list[float] = []
    for pole in poles:
        half = max(round(-pole.pole.real / (2 * np.pi) * picture.duration_s), 4)
        k = round(pole.frequency_hz * picture.duration_s)
        around = filled[max(1, k - 12 * half) : k + 12 * half + 1]
        here = filled[max(1, k - half) : k + half + 1].mean()
        if here > _STANDS_OUT * np.median(around) and not _beside(pole.frequency_hz, modes):
            found.append(pole.frequency_hz)
    return found


def _beside(frequency_hz: float, modes: Iterable[Stirred]) -> bool:
    return any(abs(m.frequency_hz - frequency_hz) < 4 * m.width_hz for m in modes)


def _survivors(
    picture: Periodogram,
    poles: Sequence[complex],
    before: Sequence[Stirred] = (),
    finished: float = ROUGH,
) -> tuple[list[Stirred], list[float]]:
    """Every group of neighbours fitted, the others held; and frequencies that were noticed only."""
    modes, faint = list(before), list[float]()
    for group in _groups(poles):
        others = [m for m in modes if m.pole not in group]
        kept, lost = fitted_group(picture, group, others, finished)
        modes = [*others, *kept]
        faint += lost
    return modes, faint


def _groups(poles: Sequence[complex]) -> list[list[complex]]:
    """Poles that overlap, together."""
    groups: list[list[complex]] = []
    for pole in sorted(poles, key=lambda p: p.imag):
        last = groups[-1] if groups else []
        if last and len(last) < _MOST_TOGETHER and _overlap(last, pole):
            last.append(pole)
        else:
            groups.append([pole])
    return groups


def _overlap(group: Sequence[complex], pole: complex) -> bool:
    return any(
        pole.imag - other.imag < 2 * _TOGETHER_WIDTHS * max(-other.real, -pole.real)
        for other in group
    )


def zone_of(picture: Periodogram, poles: Sequence[complex]) -> Zone | None:
    """Some bandwidths to both sides of the poles; None where hardly a bin is left."""
    frequency = np.array([p.imag for p in poles]) / (2 * np.pi)
    width = np.array([-p.real for p in poles]) / np.pi
    reach = np.maximum(_ZONE_WIDTHS * width, _LEAST_ZONE_BINS * picture.step_hz)
    reach = np.minimum(reach, _WIDEST_ZONE * frequency)
    return picture.zone(
        float((frequency - reach).min()), float((frequency + reach).max()), _MOST_ZONE_BINS
    )


def spectrum_of(zone: Zone, modes: Iterable[Stirred]) -> Real:
    """(m,) what modes that are held add to a zone."""
    total = np.zeros_like(zone.power)
    for mode in modes:
        values, _, _ = mode_columns(zone.frequency_hz, mode.pole, zone.duration_s)
        total += np.maximum(values @ mode.amplitude, 0.0)
    return total


def fitted_group(
    picture: Periodogram, poles: Sequence[complex], others: Sequence[Stirred], finished: float
) -> tuple[list[Stirred], list[float]]:
    """The modes of a group that bring enough likelihood each, the weakest taken away first.

    Second, the frequencies of those that were taken away although something is there.
    """
    zone = zone_of(picture, poles)
    if zone is None:
        return [], []
    held = spectrum_of(zone, others)
    fit, lost = fit_zone(zone, poles, held, finished=finished), list[float]()
    while len(fit.poles):
        without = [fit_without(zone, fit, i, held) for i in range(len(fit.poles))]
        gains = [_gain(zone, fit, i, less) for i, less in enumerate(without)]
        weakest = int(np.argmin(gains))
        if gains[weakest] >= EVIDENT:
            return stirred(fit, gains), lost
        if gains[weakest] >= _NOTICED:
            lost.append(float(abs(fit.poles[weakest]) / (2 * np.pi)))
        less = without[weakest]
        fit = fit_zone(zone, less.poles, held, finished=finished, start=less)
    return [], lost


def fit_without(zone: Zone, fit: SpectralFit, i: int, held: Real) -> SpectralFit:
    """The zone fitted with one mode less."""
    return fit_zone(zone, np.delete(fit.poles, i), held, finished=ROUGH)


def _gain(zone: Zone, fit: SpectralFit, i: int, less: SpectralFit) -> float:
    """Twice the log-likelihood a mode brings; nothing where it adds no power inside the zone."""
    frequency_hz = fit.poles[i].imag / (2 * np.pi)
    inside = zone.frequency_hz[0] < frequency_hz < zone.frequency_hz[-1]
    return 2 * (less.cost - fit.cost) if inside and fit.amplitudes[i, 0] > 0 else 0.0


def stirred(fit: SpectralFit, gains: Sequence[float]) -> list[Stirred]:
    """The modes of a fit with their covariances."""
    covariance = covariance_of(fit.information)
    found = []
    for i, pole in enumerate(fit.poles):
        at = slice(4 * i, 4 * i + 2)
        found.append(Stirred(complex(pole), fit.amplitudes[i], covariance[at, at], gains[i]))
    return found


def split(
    picture: Periodogram, mode: Stirred, others: Sequence[Stirred]
) -> tuple[list[Stirred], float]:
    """Two modes in place of one, and twice the log-likelihood that the second one brings."""
    apart = 0.4 * np.pi * mode.width_hz
    half = 0.7 * mode.pole.real
    pair = [half + 1j * (mode.pole.imag - apart), half + 1j * (mode.pole.imag + apart)]
    zone = zone_of(picture, [mode.pole])
    if zone is None:
        return [mode], 0.0
    held = spectrum_of(zone, others)
    one, two = fit_zone(zone, [mode.pole], held), fit_zone(zone, pair, held)
    gains = [_gain(zone, two, i, one) for i in range(2)]
    return stirred(two, gains), min(gains)
