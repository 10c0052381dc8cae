"""The practice rig: a simulated span that streams through the same path as an input."""

from __future__ import annotations

import threading
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.clock import now_s
from fieldkit.capture.practice_plant import PracticePlant
from fieldkit.capture.source import Block, Deliver, Ended, SourceEnd
from fieldkit.errors import InputError
from fieldkit.quantity import chosen

Real = NDArray[np.float64]

NAME = "the practice rig"
RATE_HZ = 8000
BLOCK_S = 0.02
CONTACT_S = 3e-3
"""Of a soft tip."""
FAULTS = ("double", "clipped", "soft", "gap")

_USUAL_PEAK = 0.3
"""Share of full scale that a usual blow reaches."""
_CLIPPED = 6.0
_SOFT_SD = 9.3
"""Peak of a soft blow in standard deviations of the noise: just seen, and too weak."""
_AGAIN_S = 0.06
_AGAIN_SHARE = 0.4
_GAP_AFTER_S = 0.4
_GAP_S = 0.1
_HAND_SPREAD = 0.15
_RISE_S = 0.5
_RAIL = 1 - 2.0**-15
_SETTLE_S = 0.5
_SHAKER_RAD_S = 1000.0


class Pace(Protocol):
    """What the rig keeps time with."""

    def now_s(self) -> float:
        """Seconds since some moment."""

    def wait(self, seconds: float, stop: threading.Event) -> None:
        """Let time pass, or return at once where it is to stop."""


class RealTime:
    """The clock on the wall."""

    def now_s(self) -> float:
        """Seconds on a clock that never jumps."""
        return now_s()

    def wait(self, seconds: float, stop: threading.Event) -> None:
        """Let time pass."""
        stop.wait(seconds)


@dataclass(frozen=True)
class PracticeSensor:
    """One channel of the rig: an accelerometer, or the load cell of the hammer."""

    at_m: float
    direction: str
    full_scale: float = 68.6
    """Acceleration in m/s^2, or force in N, at which the input reads 1."""
    hammer: bool = False


@dataclass(frozen=True)
class Surroundings:
    """What the sensor hears besides."""

    noise: float = 2e-3
    """Of the sensor, m/s^2 per root hertz."""
    hum: float = 0.01
    """Amplitude at 50 Hz, m/s^2."""
    flow: float = 0.1
    """Force of the flow while the machine runs, N per root hertz."""


@dataclass(frozen=True)
class _Strike:
    start: int
    newton: float
    contact_s: float
    gain: Real


class PracticeSource:
    """A source of samples that are computed; it can be struck, and its machine switched.

    What is asked of it happens at the next block. ``tap`` and ``machine`` may be called from any
    thread and return at once.
    """

    simulated = True
    name = NAME

    def __init__(
        self,
        plant: PracticePlant,
        sensors: Sequence[PracticeSensor],
        *,
        rate_hz: int = RATE_HZ,
        struck_m: float | None = None,
        surroundings: Surroundings | None = None,
        seed: int = 1,
        pace: Pace | None = None,
    ) -> None:
        """``struck_m`` is where blows land that name no place; left out, beside the sensor."""
        self.plant = plant
        self.sensors = tuple(sensors)
        self.rate_hz = rate_hz
        self.channels = len(self.sensors)
        self.struck_m = self.first.at_m if struck_m is None else struck_m
        self._surroundings = surroundings or Surroundings()
        self._pace = pace or RealTime()
        self._rng = np.random.default_rng(seed)
        self._hand = np.random.default_rng(seed + 1)
        self._lock = threading.Lock()
        self._response = ModalResponse(plant, rate_hz)
        self._heard = self._gains()
        self.usual_newton = self._usual_newton()
        self._strikes: list[_Strike] = []
        self._frame = 0
        self._gap_at: int | None = None
        self._speed_rpm, self._wanted = 0.0, 0.0
        self._loudness, self._turns = 0.0, 0.0
        self._shaker_rms: float | None = None
        self._stop = threading.Event()
        self._ends: SourceEnd | None = None

    @property
    def first(self) -> PracticeSensor:
        """The first accelerometer: blows that name no direction go its way."""
        return next((s for s in self.sensors if not s.hammer), self.sensors[0])

    def start(self, deliver: Deliver, ended: Ended) -> None:
        """Begin to stream in real time; frames count from 0 again."""
        self._stop = threading.Event()
        self._ends = None
        threading.Thread(
            target=self._stream, args=(deliver, ended, self._stop), name="practice", daemon=True
        ).start()

    def stop(self) -> None:
        """Deliver nothing more."""
        self._stop.set()

    def tap(
        self,
        strength: float = 1.0,
        *,
        contact_s: float = CONTACT_S,
        at_m: float | None = None,
        direction: str | None = None,
        fault: str = "",
    ) -> None:
        """Strike it, as hard as usual times ``strength`` and a hand's unevenness.

        ``fault`` is one of FAULTS or empty. Raises InputError where it is another.
        """
        if fault:
            chosen(fault, "fault of a blow", FAULTS)
        gain = self.plant.motion(
            self.struck_m if at_m is None else at_m, direction or self.first.direction
        )
        with self._lock:
            newton = self.usual_newton * strength * self._unevenness()
            newton *= _CLIPPED if fault == "clipped" else 1.0
            newton = self._soft_newton(gain, contact_s) if fault == "soft" else newton
            start = self._frame
            self._strikes.append(_Strike(start, newton, contact_s, gain))
            if fault == "double":
                again = start + round(_AGAIN_S * self.rate_hz)
                self._strikes.append(_Strike(again, _AGAIN_SHARE * newton, contact_s, gain))
            if fault == "gap":
                self._gap_at = start + round(_GAP_AFTER_S * self.rate_hz)

    def machine(self, *, on: bool, speed_rpm: float | None = None) -> None:
        """Switch the machine; raises InputError where there is none."""
        machine = self.plant.machine
        if machine is None:
            raise InputError("this practice rig has no machine", "name one in [[excitation]]")
        with self._lock:
            self._speed_rpm = speed_rpm or machine.speed_rpm
            self._wanted = 1.0 if on else 0.0

    def shake(self, rms: float | None) -> None:
        """Put every sensor on a reference shaker of this level in m/s^2, or back (None)."""
        with self._lock:
            self._shaker_rms = rms

    def unplug(self) -> None:
        """Let the input vanish; a new ``start`` brings it back."""
        self._ends = SourceEnd("vanished", f"{NAME} was unplugged")
        self._stop.set()

    def move(self, sensors: Sequence[PracticeSensor], struck_m: float | None = None) -> None:
        """Put the sensors elsewhere; their number stays. Raises InputError where it does not."""
        if len(sensors) != self.channels:
            raise InputError(
                f"{len(sensors)} sensor(s) for {self.channels} channel(s)", "place each of them"
            )
        with self._lock:
            self.sensors = tuple(sensors)
            self.struck_m = self.first.at_m if struck_m is None else struck_m
            self._heard = self._gains()
            self.usual_newton = self._usual_newton()

    def block(self, first_frame: int) -> Block:
        """The next block; a gap that was asked for lies before it."""
        count = max(round(BLOCK_S * self.rate_hz), 1)
        with self._lock:
            lost = 0
            if self._gap_at is not None and self._frame >= self._gap_at:
                self._gap_at, lost = None, round(_GAP_S * self.rate_hz)
                self._computed(lost)
            samples = self._computed(count)
        cause = "the practice rig dropped frames, as asked" if lost else ""
        return Block(first_frame, samples.astype(np.float32), lost, cause)

    def _stream(self, deliver: Deliver, ended: Ended, stop: threading.Event) -> None:
        begun_s, frame, passed = self._pace.now_s(), 0, 0
        while not stop.is_set():
            block = self.block(frame)
            frame += len(block.samples)
            passed += len(block.samples) + (block.lost_frames or 0)
            self._pace.wait(begun_s + passed / self.rate_hz - self._pace.now_s(), stop)
            if not stop.is_set():
                deliver(block)
        if self._ends is not None:
            ended(self._ends)

    def _computed(self, count: int) -> Real:
        """(count, channels) of what comes next, full scale 1."""
        time = self._frame + np.arange(count)
        force = np.zeros((len(self.plant.frequency_hz), count))
        struck = np.zeros(count)
        for strike in self._strikes:
            newton = half_sine(time - strike.start, strike, self.rate_hz)
            struck += newton
            force += np.outer(strike.gain, newton)
        self._strikes = [s for s in self._strikes if s.start + self.rate_hz > self._frame]
        force += self._machine_force(count)
        motion = self._heard @ self._response.acceleration(force)
        motion += np.outer([s.hammer / s.full_scale for s in self.sensors], struck)
        if self._shaker_rms is not None:
            shaken = np.sqrt(2) * self._shaker_rms * np.sin(_SHAKER_RAD_S * time / self.rate_hz)
            motion = np.outer(1 / self._scales(), shaken)
        motion += self._unwanted(time, count)
        self._frame += count
        return np.clip(motion.T, -1.0, _RAIL)

    def _machine_force(self, count: int) -> Real | float:
        machine = self.plant.machine
        if machine is None or (self._wanted == 0 and self._loudness < 1e-6):
            return 0.0
        time_s = np.arange(1, count + 1) / self.rate_hz
        left = np.exp(-time_s / _RISE_S)
        loudness = self._wanted + (self._loudness - self._wanted) * left
        turns = self._turns + self._speed_rpm / 60 * time_s
        self._loudness, self._turns = float(loudness[-1]), float(turns[-1])
        force = sum(n * np.sin(2 * np.pi * order * turns) for order, n in machine.newton)
        flow = self._surroundings.flow * np.sqrt(self.rate_hz / 2)
        force = force + flow * self._rng.standard_normal(count)
        return np.outer(self.plant.along(machine.at_m, machine.along), loudness * force)

    def _unwanted(self, time: NDArray[np.integer], count: int) -> Real:
        """(channels, count) noise and hum, full scale 1."""
        around = self._surroundings
        noise = self._rng.standard_normal((self.channels, count))
        heard = around.noise * np.sqrt(self.rate_hz / 2) * noise
        heard += around.hum * np.sin(2 * np.pi * 50 * time / self.rate_hz)
        return np.asarray(heard / self._scales()[:, None])

    def _scales(self) -> Real:
        return np.array([sensor.full_scale for sensor in self.sensors])

    def _gains(self) -> Real:
        """(channels, m) sample of full scale 1 per modal acceleration."""
        rows = [
            (not s.hammer) * self.plant.motion(s.at_m, s.direction) / s.full_scale
            for s in self.sensors
        ]
        return np.array(rows)

    def _unevenness(self) -> float:
        return float(np.exp(_HAND_SPREAD * self._hand.standard_normal()))

    def _usual_newton(self) -> float:
        gain = self.plant.motion(self.struck_m, self.first.direction)
        return _USUAL_PEAK / self._peak(gain, CONTACT_S)

    def _soft_newton(self, gain: Real, contact_s: float) -> float:
        around, scale = self._surroundings, self.first.full_scale
        noise = np.hypot(around.noise * np.sqrt(self.rate_hz / 2), around.hum / np.sqrt(2))
        return float(_SOFT_SD * noise / scale / self._peak(gain, contact_s))

    def _peak(self, gain: Real, contact_s: float) -> float:
        """Largest sample that a blow of one newton makes."""
        strike = _Strike(0, 1.0, contact_s, gain)
        time = np.arange(round(_SETTLE_S * self.rate_hz))
        force = np.outer(gain, half_sine(time, strike, self.rate_hz))
        moved = self._heard @ ModalResponse(self.plant, self.rate_hz).acceleration(force)
        return max(float(np.abs(moved).max()), 1e-12)


def half_sine(after: NDArray[np.integer], strike: _Strike, rate_hz: float) -> Real:
    """Force of a blow so many frames after its start."""
    phase = after / rate_hz / strike.contact_s
    inside = (phase > 0) & (phase < 1)
    return np.asarray(np.where(inside, strike.newton * np.sin(np.pi * phase), 0.0))


class ModalResponse:
    """Every mode as an exact discrete filter for a force that runs straight between samples."""

    def __init__(self, plant: PracticePlant, rate_hz: float) -> None:
        from scipy.signal import cont2discrete

        self._filters = []
        for hz, zeta in zip(plant.frequency_hz, plant.damping_ratio, strict=True):
            omega = 2 * np.pi * hz
            system = (np.array([1.0, 0, 0]), np.array([1.0, 2 * zeta * omega, omega**2]))
            above, below, _ = cont2discrete(system, 1 / rate_hz, method="foh")
            self._filters.append((np.ravel(above), below, np.zeros(2)))

    def acceleration(self, force: Real) -> Real:
        """(m, n) modal accelerations under modal forces (m, n), going on where it ended."""
        from scipy.signal import lfilter

        out = np.empty_like(force)
        for i, (above, below, held) in enumerate(self._filters):
            out[i], held[:] = lfilter(above, below, force[i], zi=held)
        return out
