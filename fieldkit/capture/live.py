"""A spectrum while it is heard: more than ten a second, at a cost that does not grow with the rate.

The channel is lowered to a rate just above what is shown, and transforms are taken of its last
seconds only.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.source import Block
from fieldkit.signal.decimation import by_phases, lowpass
from fieldkit.signal.recording import SI_UNIT
from fieldkit.signal.spectrum import SAMPLE_UNITS
from fieldkit.signal.welch import one_sided
from fieldkit.signal.windows import HFT90D

Real = NDArray[np.float64]

PICTURES_PER_S = 12.0
WINDOW_S = 4.0
AVERAGE_S = 20.0
_KEPT_OF_RATE = 0.39
_MOST_SAMPLES = 1 << 15
_LEAST_SAMPLES = 64
_LINE_REACH = 0.01
_LINE_BINS = 4.0


@dataclass(frozen=True)
class OrderLine:
    """A multiple of the machine's speed, to lay over the spectrum."""

    order: float
    frequency_hz: float
    level: float | None
    """RMS of the highest line beside it, in the unit of the picture; None where nothing is yet."""


@dataclass(frozen=True, eq=False)
class LivePicture:
    """The spectrum at one moment; a steady sine reads its RMS."""

    number: int
    """Counts the pictures."""
    frequency_hz: Real
    """(m,) evenly spaced from 0."""
    now: Real
    """(m,) of the last seconds."""
    averaged: Real
    """(m,) power averaged since the start, or the last reset, the recent past more."""
    window_s: float
    """How much of the past ``now`` shows."""
    overall: float
    """RMS of the whole band without its mean over the same time."""
    unit: str
    """SI unit of the quantity, or ``sample units``."""
    order_lines: tuple[OrderLine, ...] = field(default=())


def order_frequencies(
    speed_rpm: float, orders: Sequence[float], top_hz: float
) -> tuple[tuple[float, float], ...]:
    """(order, frequency in Hz) of those that lie within the picture."""
    found = [(order, order * speed_rpm / 60) for order in orders]
    return tuple((order, hz) for order, hz in found if 0 < hz <= top_hz)


class LiveSpectrum:
    """A listener of a session; ``picture`` is replaced as a whole, and may be read at any time."""

    def __init__(
        self,
        *,
        rate_hz: float,
        channel: int = 0,
        top_hz: float = 200.0,
        window_s: float = WINDOW_S,
        quantity: str | None = None,
        scale: float | None = None,
    ) -> None:
        """``scale``: SI units of the quantity per unit of sample; None where uncalibrated."""
        self.picture: LivePicture | None = None
        self._channel = channel
        calibrated = quantity is not None and scale is not None
        self._factor = scale if scale is not None and calibrated else 1.0
        self._unit = SI_UNIT[quantity] if quantity is not None and calibrated else SAMPLE_UNITS
        self._window: Real = np.zeros(0)
        self._rate_hz = rate_hz
        self._top_hz = min(top_hz, _KEPT_OF_RATE * rate_hz)
        self._step = max(int(rate_hz * _KEPT_OF_RATE // self._top_hz), 1)
        self._low_rate_hz = rate_hz / self._step
        stop_hz = self._low_rate_hz - self._top_hz
        self._weights = lowpass(rate_hz, self._top_hz, stop_hz) if self._step > 1 else np.ones(1)
        self._most = min(round(window_s * self._low_rate_hz), _MOST_SAMPLES)
        self._every = max(round(rate_hz / PICTURES_PER_S), 1)
        self._orders: tuple[tuple[float, float], ...] = ()
        self._number = 0
        self.reset()

    def reset(self) -> None:
        """Begin to average anew, and forget the past."""
        self._waiting: Real = np.zeros(0)
        self._low: Real = np.zeros(0)
        self._squares: Real = np.zeros((0, 3))
        self._power: Real | None = None
        self._since = 0

    def set_orders(self, speed_rpm: float | None, orders: Sequence[float] = (1.0, 2.0)) -> None:
        """Lay multiples of a speed over the picture; None: none."""
        wanted = order_frequencies(speed_rpm, orders, self._top_hz) if speed_rpm else ()
        self._orders = wanted

    def feed(self, block: Block) -> None:
        """Take a block of the session; what lies before a gap is forgotten, the average is kept."""
        if block.lost_frames != 0:
            self._waiting = self._low = np.zeros(0)
            self._squares = np.zeros((0, 3))
        samples = block.samples[:, self._channel].astype(float)
        self._waiting = np.concatenate([self._waiting, samples])
        self._lower()
        self._note_level(samples)
        self._since += len(samples)
        if self._since >= self._every and len(self._low) >= _LEAST_SAMPLES:
            self._draw(self._since / self._rate_hz)
            self._since = 0

    def _lower(self) -> None:
        """Move what waits to the low rate, keeping what the filter still needs."""
        turns = -(-len(self._weights) // self._step)
        if len(self._waiting) < turns * self._step:
            return
        fresh = by_phases(self._waiting, self._weights, self._step)
        self._waiting = self._waiting[len(fresh) * self._step :]
        self._low = np.concatenate([self._low, fresh])[-self._most :]

    def _note_level(self, samples: Real) -> None:
        """Count, sum and sum of squares of each block of the window."""
        if not len(samples):
            return
        row = [[len(samples), samples.sum(), samples @ samples]]
        self._squares = np.concatenate([self._squares, row])
        wanted = self._most / self._low_rate_hz * self._rate_hz
        counted = np.cumsum(self._squares[::-1, 0])[::-1]
        self._squares = self._squares[counted - self._squares[:, 0] < wanted]

    def _draw(self, since_s: float) -> None:
        length = len(self._low)
        if len(self._window) != length:
            self._window = HFT90D.samples(length)
        weighted = (self._low - self._low.mean()) * self._window
        power = np.abs(np.fft.rfft(weighted)) ** 2
        if self._power is None or len(self._power) != len(power):
            self._power = power
        else:
            share = min(since_s / AVERAGE_S, 1.0)
            self._power = self._power + share * (power - self._power)
        now, averaged = self._amplitude(power), self._amplitude(self._power)
        frequency_hz = np.arange(len(power)) * self._low_rate_hz / length
        kept = frequency_hz <= self._top_hz
        count, total, squares = self._squares.sum(axis=0)
        overall = float(np.sqrt(max(squares / count - (total / count) ** 2, 0.0)))
        self._number += 1
        self.picture = LivePicture(
            self._number,
            frequency_hz[kept],
            now[kept],
            averaged[kept],
            length / self._low_rate_hz,
            overall * self._factor,
            self._unit,
            self._lines(frequency_hz[kept], averaged[kept]),
        )

    def _amplitude(self, power: Real) -> Real:
        """(m,) RMS of a sine on each line, as ``flat_top_spectrum`` scales it."""
        counts = one_sided(len(self._window))
        return np.asarray(self._factor * np.sqrt(counts * power) / self._window.sum())

    def _lines(self, frequency_hz: Real, amplitude: Real) -> tuple[OrderLine, ...]:
        reach_hz = _LINE_BINS * float(frequency_hz[1])
        return tuple(
            OrderLine(order, hz, _highest(frequency_hz, amplitude, hz, reach_hz))
            for order, hz in self._orders
        )


def _highest(frequency_hz: Real, amplitude: Real, hz: float, reach_hz: float) -> float | None:
    near = np.abs(frequency_hz - hz) <= max(reach_hz, _LINE_REACH * hz)
    return float(amplitude[near].max()) if near.any() else None
