"""Free decays made ready for fitting, and what has been found in them so far."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.background import NoiseDensity
from fieldkit.signal.decays import damped, damped_total

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]


_WHOLE = 0.9
"""Of a trace: whoever asks for more of it gets all."""
_STEPS_PER_OCTAVE = 4
_LEAST_TERMS = 4
_MOST_RAD = 8.0


def fast_length(wanted: float) -> int:
    """A number near to but not below ``wanted`` that has a fast transform."""
    from scipy.fft import next_fast_len

    step = np.ceil(np.log2(wanted) * _STEPS_PER_OCTAVE) / _STEPS_PER_OCTAVE
    return int(next_fast_len(int(np.ceil(2.0**step)), real=True))


@dataclass(frozen=True)
class Trace:
    """One tap's free decay at the analysis rate."""

    samples: Real
    """(n,)"""
    rate_hz: float
    noise: NoiseDensity
    spectra: dict[int, Complex] = field(default_factory=dict, compare=False, repr=False)
    """Transforms of the first so many samples, kept because each is used often."""

    @property
    def duration_s(self) -> float:
        """Length in time."""
        return len(self.samples) / self.rate_hz

    @cached_property
    def fast_whole(self) -> int:
        """The largest number of samples up to all that is fast to transform."""
        from scipy.fft import prev_fast_len

        return int(prev_fast_len(len(self.samples), real=True))

    def fast_count(self, duration_s: float) -> int:
        """Samples of about a duration: few different numbers, and fast to transform."""
        most = self.fast_whole
        wanted = max(duration_s * self.rate_hz, 16)
        if wanted >= _WHOLE * most:
            return most
        return min(fast_length(float(wanted)), most)

    def spectrum(self, count: int) -> Complex:
        """(count // 2 + 1,) transform of the first ``count`` samples."""
        if count not in self.spectra:
            self.spectra[count] = np.fft.rfft(self.samples[:count])
        return self.spectra[count]


@dataclass(frozen=True)
class Component:
    """A damped exponential or steady tone in K taps: Re[(a + b t) exp(p t)] with p = poles."""

    poles: Complex
    """(K,) 1/s; equal for all taps unless the taps were seen to disagree."""
    amplitudes: Complex
    """(K,) unit of the samples, at the start of each tap."""
    slopes: Complex
    """(K,) unit per second; 0 except for tones that wander."""
    steady: bool = False
    """True for a tone: no decay, in the fit at a fixed frequency."""
    bend: float = 0.0
    """Radians per unit amplitude by which the phase has run ahead when the decay is over: not 0
    for a mode whose frequency drifts with its amplitude."""

    @cached_property
    def pole(self) -> complex:
        """The pole shared by the taps."""
        return complex(self.poles.sum()) / len(self.poles)

    @property
    def frequency_hz(self) -> float:
        """Damped natural frequency: where its line stands in a spectrum."""
        return float(self.pole.imag / (2 * np.pi))

    @property
    def natural_hz(self) -> float:
        """Undamped natural frequency."""
        return float(abs(self.pole) / (2 * np.pi))

    @property
    def decay_per_s(self) -> float:
        """Decay rate."""
        return float(-self.pole.real)

    @property
    def damping_ratio(self) -> float:
        """Decay rate over undamped angular frequency."""
        return self.decay_per_s / abs(self.pole)

    @property
    def drift_hz(self) -> float:
        """Frequency right after the strongest blow less that at small amplitude."""
        farthest = self.leads[np.argmax(np.abs(self.leads))]
        return float(farthest * self.decay_per_s / (2 * np.pi))

    @property
    def leads(self) -> Real:
        """(K,) radians by which the phase runs ahead in each tap; more than a turn is not meant."""
        return np.asarray(np.clip(self.bend * np.abs(self.amplitudes), -_MOST_RAD, _MOST_RAD))

    @property
    def half_power_hz(self) -> float:
        """Half-power bandwidth."""
        return self.decay_per_s / np.pi

    def with_pole(self, pole: complex) -> Component:
        """The same with one pole for all taps."""
        return replace(self, poles=np.full_like(self.poles, pole))


def component(pole: complex, taps: int, *, steady: bool = False) -> Component:
    """A component of no amplitude yet."""
    nothing = np.zeros(taps, complex)
    return Component(np.full(taps, pole), nothing, nothing, steady)


def bent_weights(part: Component) -> Complex:
    """(N, K) weights of exponentials of once, twice, ... the decay that make a drifting one.

    exp(i b (1 - exp(-s t))) by its power series in exp(-s t).
    """
    lead = part.leads
    most = float(np.abs(lead).max(initial=0.0))
    order = np.arange(int(_LEAST_TERMS + 8 * min(most, 1.0) + 4 * most))[:, None]
    factors = np.where(order > 0, -1j * lead / np.maximum(order, 1), 1.0)
    return np.asarray(np.exp(1j * lead) * np.cumprod(factors, axis=0))


def unbent(part: Component) -> list[Component]:
    """A component whose frequency drifts as a sum of some whose frequencies do not."""
    if not part.bend:
        return [part]
    weights = bent_weights(part)
    return [
        replace(
            part,
            poles=part.poles + n * part.poles.real,
            amplitudes=part.amplitudes * own,
            bend=0.0,
        )
        for n, own in enumerate(weights)
    ]


def residual(trace: Trace, tap: int, components: Sequence[Component]) -> Real:
    """(n,) what the components leave of tap number ``tap``."""
    count, rate_hz = len(trace.samples), trace.rate_hz
    plain = [(p.poles[tap], p.amplitudes[tap], p.slopes[tap]) for p in components if not p.bend]
    left = trace.samples.copy()
    if plain:
        poles, amplitudes, slopes = np.array(plain).T
        left -= damped_total(poles / rate_hz, amplitudes, slopes / rate_hz, count)
    for part in components:
        if part.bend:
            left -= sampled(part, tap, count, rate_hz)
    return left


def sampled(part: Component, tap: int, count: int, rate_hz: float) -> Real:
    """(count,) samples of a component in one tap."""
    wave = damped(part.poles[tap] / rate_hz, count)
    if part.bend:
        lead = part.leads[tap]
        envelope = damped(part.poles[tap].real / rate_hz, count).real
        wave = wave * np.exp(1j * lead * (1 - envelope))
    if part.slopes[tap] == 0:
        return np.asarray((part.amplitudes[tap] * wave).real)
    time_s = np.arange(count) / rate_hz
    return np.asarray(((part.amplitudes[tap] + part.slopes[tap] * time_s) * wave).real)


def decay_energy(part: Component, traces: Sequence[Trace]) -> Real:
    """(K,) integral of the squared decay over each trace, unit squared seconds."""
    rate = 2 * np.maximum(-part.poles.real, 1e-9)
    durations = np.array([t.duration_s for t in traces])
    return np.asarray(np.abs(part.amplitudes) ** 2 / 2 * -np.expm1(-rate * durations) / rate)
