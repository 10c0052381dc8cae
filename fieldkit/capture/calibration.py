"""Sensitivity of a sensor on a reference shaker of 1000 rad/s, about 159.155 Hz."""

from __future__ import annotations

import datetime
import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.setup import ChannelSetup
from fieldkit.errors import Refusal
from fieldkit.quantity import parse

Real = NDArray[np.float64]

REFERENCE_HZ = 1000 / (2 * math.pi)
"""1000 rad/s: there 10 m/s^2 are 10 mm/s and 10 um (common practice; arithmetic exact)."""
REFERENCE = "10 m/s^2"
"""RMS of the usual reference; others shake with 1 g."""
REFERENCE_SD = 0.015
"""Relative standard deviation of its level: handheld shakers promise 3 % (common practice, no
source)."""
NEEDED_S = 3.0

FREQUENCY_OFF = 0.01
LARGEST_LEVEL_SD = 0.005
LARGEST_DISTORTION = 0.03
LEAST_PEAK = 1e-3
LEAST_OVER_NOISE_DB = 30.0
_RAIL = 0.999
_BLOCK_S = 0.25
_HARMONICS = (2, 3, 4, 5)
_ITERATIONS = 20
_LEAST_RATE_HZ = 1000.0


@dataclass(frozen=True)
class SineFit:
    """A steady sine with an offset, by least squares."""

    frequency_hz: float
    amplitude: float
    """Peak, in the samples' unit."""
    offset: float
    residual_rms: float
    """What the sine leaves, in the samples' unit."""


@dataclass(frozen=True)
class Calibration:
    """What a reference shaker said about one channel."""

    frequency_hz: float
    reference_rms: float
    """Acceleration of the shaker, m/s^2."""
    sample_rms: float
    """Of the sine in the samples, full scale 1."""
    relative_sd: float
    """Of the result: level of the reference, steadiness, and noise together."""
    level_sd: float
    """Relative standard deviation of the level from quarter second to quarter second."""
    distortion: float
    """Harmonics 2 to 5 over the fundamental."""
    day: datetime.date

    @property
    def si_per_unit(self) -> float:
        """m/s^2 that a sample of 1 stands for."""
        return self.reference_rms / self.sample_rms

    def keys(self, full_scale: str | None) -> dict[str, str]:
        """The keys of a ``[[recording]]``: a sensitivity where the voltage of a full input is
        known, else a scale."""
        if full_scale is None:
            return {"scale": f"{self.si_per_unit:.4g} m/s^2 per unit"}
        volts = parse(full_scale, "voltage")
        per_g = volts / self.si_per_unit * 9.80665
        return {"sensitivity": f"{1e3 * per_g:.4g} mV/g", "full_scale": full_scale}

    def setup(self, before: ChannelSetup) -> ChannelSetup:
        """The channel with what was measured in place of what was written on the sensor."""
        bare = replace(before, sensitivity=None, full_scale=None, scale=None)
        return replace(bare, **self.keys(before.full_scale))

    def comment(self, full_scale: str | None) -> str:
        """Date and result, for the job file."""
        said = self.keys(full_scale)
        value = said.get("sensitivity") or said["scale"]
        return (
            f"calibrated {self.day.isoformat()} at {self.frequency_hz:.2f} Hz and "
            f"{self.reference_rms:.4g} m/s^2 rms: {value}, +/- {200 * self.relative_sd:.1f} %"
        )


def calibrate(
    samples: NDArray[np.floating],
    rate_hz: float,
    *,
    reference_rms: float = 10.0,
    day: datetime.date | None = None,
) -> Calibration:
    """Read a steady stretch (n,) of one channel, full scale 1, with the sensor on the shaker.

    Fit of a sine with free frequency (four parameters, IEEE Std 1057). Raises Refusal where it is
    too short, clipped, too weak, of another frequency, unsteady or distorted.
    """
    signal = np.asarray(samples, float)
    _check_long_enough(signal, rate_hz)
    if np.abs(signal).max() >= _RAIL:
        raise Refusal("the input clips", "lower the input level, then note it and calibrate again")
    fit = fit_sine(signal, rate_hz, strongest_hz(signal, rate_hz))
    _check_strength(fit)
    _check_frequency(fit)
    level_sd = level_spread(signal, rate_hz, fit.frequency_hz)
    if level_sd > LARGEST_LEVEL_SD:
        raise Refusal(
            f"the level varies by {100 * level_sd:.1f} % (at most {100 * LARGEST_LEVEL_SD:.1f} %)",
            "mount the sensor firmly, hold its cable still, and wait until the shaker is steady",
        )
    distortion = harmonic_distortion(signal, rate_hz, fit)
    if distortion > LARGEST_DISTORTION:
        raise Refusal(
            f"harmonics are {100 * distortion:.1f} % of it (at most "
            f"{100 * LARGEST_DISTORTION:.0f} %)",
            "check the battery of the shaker, the mounting, and that the sensor is not too heavy",
        )
    _check_noise(fit)
    blocks = len(signal) / rate_hz / _BLOCK_S
    noise = fit.residual_rms / fit.amplitude * math.sqrt(2 / len(signal))
    return Calibration(
        fit.frequency_hz,
        reference_rms,
        fit.amplitude / math.sqrt(2),
        math.sqrt(REFERENCE_SD**2 + level_sd**2 / blocks + noise**2),
        level_sd,
        distortion,
        day or datetime.date.today(),
    )


def fit_sine(signal: Real, rate_hz: float, start_hz: float) -> SineFit:
    """Four-parameter sine fit (IEEE Std 1057): Gauss-Newton on frequency, the rest linear."""
    time_s = (np.arange(len(signal)) - (len(signal) - 1) / 2) / rate_hz
    omega = 2 * math.pi * start_hz
    cosine, sine = 1.0, 0.0
    for iteration in range(_ITERATIONS):
        c, s = np.cos(omega * time_s), np.sin(omega * time_s)
        slope = time_s * (sine * c - cosine * s)
        columns = [c, s, np.ones_like(c), slope][: 3 if iteration == 0 else 4]
        solved = np.linalg.lstsq(np.stack(columns, axis=1), signal, rcond=None)[0]
        cosine, sine, offset = solved[:3]
        change = float(solved[3]) if iteration else math.inf
        omega += change if iteration else 0.0
        if abs(change) < 1e-9 * omega:
            break
    left = signal - cosine * np.cos(omega * time_s) - sine * np.sin(omega * time_s) - offset
    amplitude = math.hypot(cosine, sine)
    rms = float(np.sqrt(np.mean(left**2)))
    return SineFit(omega / (2 * math.pi), amplitude, float(offset), rms)


def strongest_hz(signal: Real, rate_hz: float) -> float:
    """Frequency of the highest line, between bins by a parabola through the logarithms."""
    weighted = (signal - signal.mean()) * np.hanning(len(signal))
    power = np.abs(np.fft.rfft(weighted)) ** 2
    at = int(np.clip(np.argmax(power), 1, len(power) - 2))
    low, top, high = np.log(np.maximum(power[at - 1 : at + 2], 1e-300))
    curve = low - 2 * top + high
    shift = 0.5 * (low - high) / curve if curve < 0 else 0.0
    return float((at + shift) * rate_hz / len(signal))


def level_spread(signal: Real, rate_hz: float, frequency_hz: float) -> float:
    """Relative standard deviation of the sine's amplitude over quarters of a second."""
    length = round(_BLOCK_S * rate_hz)
    blocks = signal[: len(signal) // length * length].reshape(-1, length)
    columns = _harmonic_columns(length, rate_hz, frequency_hz, (1,))
    solved = np.linalg.lstsq(columns, blocks.T, rcond=None)[0]
    amplitude = np.hypot(solved[1], solved[2])
    return float(np.std(amplitude, ddof=1) / np.mean(amplitude))


def harmonic_distortion(signal: Real, rate_hz: float, fit: SineFit) -> float:
    """Harmonics 2 to 5 over the fundamental, as far as the rate reaches."""
    orders = [n for n in _HARMONICS if n * fit.frequency_hz < 0.45 * rate_hz]
    columns = _harmonic_columns(len(signal), rate_hz, fit.frequency_hz, (1, *orders))
    solved = np.linalg.lstsq(columns, signal, rcond=None)[0][1:].reshape(-1, 2)
    amplitude = np.hypot(solved[:, 0], solved[:, 1])
    return float(np.linalg.norm(amplitude[1:]) / amplitude[0])


def _harmonic_columns(
    count: int, rate_hz: float, frequency_hz: float, orders: tuple[int, ...]
) -> Real:
    phase = 2 * np.pi * frequency_hz * np.arange(count) / rate_hz
    waves = [wave(n * phase) for n in orders for wave in (np.cos, np.sin)]
    return np.stack([np.ones(count), *waves], axis=1)


def _check_long_enough(signal: Real, rate_hz: float) -> None:
    if rate_hz < _LEAST_RATE_HZ:
        raise Refusal(
            f"a rate of {rate_hz:g} Hz is too low for {REFERENCE_HZ:.0f} Hz and its harmonics",
            f"choose {_LEAST_RATE_HZ:g} Hz or more",
        )
    if len(signal) < NEEDED_S * rate_hz:
        raise Refusal(
            f"only {len(signal) / rate_hz:.1f} s were heard", f"hold still for {NEEDED_S:g} s"
        )


def _check_strength(fit: SineFit) -> None:
    if fit.amplitude < LEAST_PEAK:
        raise Refusal(
            "hardly anything arrives at the input",
            "switch the shaker on, check cable and sensor supply, or raise the input level",
        )


def _check_frequency(fit: SineFit) -> None:
    off = fit.frequency_hz / REFERENCE_HZ - 1
    if abs(off) > FREQUENCY_OFF:
        raise Refusal(
            f"the strongest line is at {fit.frequency_hz:.2f} Hz, and the reference shakes at "
            f"{REFERENCE_HZ:.2f} Hz",
            "put the sensor on the reference shaker and switch it on",
        )


def _check_noise(fit: SineFit) -> None:
    over_db = 20 * math.log10(fit.amplitude / math.sqrt(2) / max(fit.residual_rms, 1e-12))
    if over_db < LEAST_OVER_NOISE_DB:
        raise Refusal(
            f"the sine stands only {over_db:.0f} dB over the noise",
            "raise the input level, or calibrate where it is quiet",
        )
