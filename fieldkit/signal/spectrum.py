"""Spectra with amplitude-true scaling."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import InputError, Refusal
from fieldkit.signal.integration import CORNER_HZ, frequency_factor, integrals_between
from fieldkit.signal.recording import SI_UNIT
from fieldkit.signal.welch import (
    SegmentPower,
    line_frequencies,
    one_sided,
    segment_length,
    segment_power,
)
from fieldkit.signal.windows import HANN, HFT90D

SAMPLE_UNITS = "sample units"
FLAT_TOP_OVERLAP = 0.76
"""Recommended for HFT90D by Heinzel, Ruediger and Schilling 2002."""
HANN_OVERLAP = 0.5
_BLOCK_SAMPLES = 2**21


@dataclass(frozen=True)
class Spectrum:
    """Amplitude against frequency, for looking at and for reading lines from."""

    frequency_hz: NDArray[np.float64]
    """(m,) evenly spaced from 0."""
    amplitude: NDArray[np.float64]
    """(m,) see ``scaling``."""
    scaling: str
    """``rms`` (a steady sine reads its RMS) or ``decay`` (mean magnitude of a tap's transform)."""
    quantity: str | None
    unit: str
    """SI unit of the quantity, or ``sample units`` where uncalibrated."""
    bandwidth_hz: float
    """Equivalent noise bandwidth of one line."""


def tap_spectrum(
    decays: Sequence[NDArray[np.float64]],
    rate_hz: float,
    *,
    quantity: str | None = None,
    scale: float | None = None,
) -> Spectrum:
    """Mean magnitude of the transforms of free decays, each (n_k,), in unit seconds.

    No window: a decay that starts after the blow and dies out inside its record has no ends to
    smooth, and a window would broaden every peak. Each decay is freed of its mean, padded with
    zeros to twice the longest, and divided by its own strength (the root of its energy) before
    averaging, so that a hard blow counts as much as a soft one; the average is multiplied by the
    geometric mean of the strengths. Raises Refusal where there is no decay to average.
    """
    from scipy.fft import next_fast_len

    if not decays or min(map(len, decays)) < 2:
        raise Refusal("there is no usable tap to average", "tap again, harder and apart")
    step_s = 1 / rate_hz
    length = int(next_fast_len(2 * max(map(len, decays)), real=True))
    centred = [decay - np.mean(decay) for decay in decays]
    strengths = np.array([np.sqrt(np.sum(decay**2) * step_s) for decay in centred])
    if not np.all(strengths > 0):
        raise Refusal("a tap holds no signal", "check the channel, then tap again")
    total = np.zeros(length // 2 + 1)
    for decay, strength in zip(centred, strengths, strict=True):
        total += np.abs(np.fft.rfft(decay, length)) * step_s / strength
    factor, unit = _calibration(quantity, scale)
    level = float(np.exp(np.mean(np.log(strengths))))
    return Spectrum(
        frequency_hz=line_frequencies(length, rate_hz),
        amplitude=factor * level * total / len(centred),
        scaling="decay",
        quantity=quantity,
        unit=unit,
        bandwidth_hz=float(np.mean([rate_hz / len(decay) for decay in decays])),
    )


def running_spectrum(
    signal: NDArray[np.float64],
    rate_hz: float,
    *,
    quantity: str | None = None,
    scale: float | None = None,
    low_hz: float = CORNER_HZ,
) -> Spectrum:
    """Spectrum of a steady signal (n,) in which a sine reads its RMS, on a line or between lines.

    Welch's method with the flat-top window HFT90D, which reads a sine within 0.045 %, on
    segments chosen from the length of the record and the lowest frequency of interest.
    """
    length = segment_length(len(signal), rate_hz, low_hz)
    power = segment_power(signal, HFT90D, length, FLAT_TOP_OVERLAP)
    return flat_top_spectrum(power, rate_hz, quantity=quantity, scale=scale)


def flat_top_spectrum(
    power: SegmentPower, rate_hz: float, *, quantity: str | None = None, scale: float | None = None
) -> Spectrum:
    """The running spectrum out of the mean power of segments windowed by HFT90D."""
    length = power.length
    factor, unit = _calibration(quantity, scale)
    counts = one_sided(length)
    return Spectrum(
        frequency_hz=line_frequencies(length, rate_hz),
        amplitude=factor * np.sqrt(counts * power.mean) / HFT90D.samples(length).sum(),
        scaling="rms",
        quantity=quantity,
        unit=unit,
        bandwidth_hz=HFT90D.noise_bandwidth_bins * rate_hz / length,
    )


def power_density(
    signal: NDArray[np.float64],
    rate_hz: float,
    *,
    scale: float | None = None,
    low_hz: float = CORNER_HZ,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Frequencies (m,) in Hz and one-sided power density (m,) in unit^2/Hz of noise.

    Welch's method with a Hann window and half overlap.
    """
    length = segment_length(len(signal), rate_hz, low_hz)
    return hann_density(segment_power(signal, HANN, length, HANN_OVERLAP), rate_hz, scale=scale)


def hann_density(
    power: SegmentPower, rate_hz: float, *, scale: float | None = None
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The power density out of the mean power of Hann-windowed segments."""
    weights = HANN.samples(power.length)
    per_line = rate_hz * (weights @ weights)
    density = (scale or 1.0) ** 2 * one_sided(power.length) * power.mean / per_line
    return line_frequencies(power.length, rate_hz), density


def convert(spectrum: Spectrum, to_quantity: str, corner_hz: float = CORNER_HZ) -> Spectrum:
    """Acceleration, velocity or displacement spectrum as another of the three.

    Integration divides by 2 pi f and leaves nothing at zero frequency and below the corner, where
    it would show amplified noise. Raises InputError where the quantity is not one of motion.
    """
    integrals = integrals_between(spectrum.quantity, to_quantity)
    if integrals == 0:
        return spectrum
    factor = frequency_factor(spectrum.frequency_hz, integrals, corner_hz)
    unit = SAMPLE_UNITS if spectrum.unit == SAMPLE_UNITS else SI_UNIT[to_quantity]
    return replace(spectrum, amplitude=spectrum.amplitude * factor, quantity=to_quantity, unit=unit)


def overall_rms(
    signal: NDArray[np.float64], rate_hz: float, low_hz: float, high_hz: float
) -> float:
    """RMS of what a signal (n,) holds from ``low_hz`` to ``high_hz``, both included.

    By Parseval's theorem on the transform without a window, so that the whole band, 0 to half the
    rate, gives the RMS of the samples. A record beyond four million samples is cut into blocks of
    two to four million, whose energies are added.
    """
    if not 0 <= low_hz < high_hz:
        raise InputError(
            f"a band from {low_hz:g} to {high_hz:g} Hz", "give the lower frequency first"
        )
    cuts = range(_BLOCK_SAMPLES, len(signal) - _BLOCK_SAMPLES, _BLOCK_SAMPLES)
    blocks = np.split(signal, cuts)
    energy = sum(_band_energy(block, rate_hz, low_hz, high_hz) for block in blocks)
    return float(np.sqrt(energy / len(signal)))


def _band_energy(
    block: NDArray[np.float64], rate_hz: float, low_hz: float, high_hz: float
) -> float:
    """Sum of squares of the samples of a block (n,) that the band accounts for."""
    frequency_hz = line_frequencies(len(block), rate_hz)
    inside = (frequency_hz >= low_hz) & (frequency_hz <= high_hz)
    power = one_sided(len(block)) * np.abs(np.fft.rfft(block)) ** 2
    return float(power[inside].sum() / len(block))


def _calibration(quantity: str | None, scale: float | None) -> tuple[float, str]:
    """Factor to SI and the unit; samples of an unknown quantity or scale stay as they are."""
    if quantity is None or scale is None:
        return 1.0, SAMPLE_UNITS
    return scale, SI_UNIT[quantity]
