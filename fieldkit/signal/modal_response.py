"""Known poles fitted to a measured frequency response: what each mode contributes.

In receptance a mode contributes (R + S i w / w_r) / (w_r^2 - w^2 + 2 i zeta w_r w). R is its modal
constant: the product of its shape at sensor and hammer over its modal mass; S stays near zero where
damping is light and the channels are sampled together. Modes below the fitted lines act as
-1 / (m w^2), those above as 1 / k. (Ewins, Modal Testing, 2nd ed., 2000, chapters 2 and 4.)
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from fieldkit.errors import Refusal
from fieldkit.signal.response import DERIVATIVES, FrequencyResponse, coherence_near

Real = NDArray[np.float64]
Complex = NDArray[np.complex128]

_BANDWIDTHS = 12.0
"""Half-power bandwidths on either side of a mode whose lines are fitted."""
_LEAST_LINES = 8
_SMOOTHED_LINES = 9
_RELATIVE_DOUBT = 0.01
"""No line is trusted better than this share of its value: blows never repeat exactly."""
_USUAL_DERIVATIVE = 2
"""Sound pressure near a pipe, and what nobody named, is taken to follow acceleration."""


class Pole(Protocol):
    """What is needed of a measured mode."""

    @property
    def frequency_hz(self) -> float:
        """Undamped natural frequency."""

    @property
    def damping_ratio(self) -> float | None:
        """Of critical."""

    @property
    def frequency_sd_hz(self) -> float:
        """Its standard deviation."""

    @property
    def damping_sd(self) -> float | None:
        """Its standard deviation."""


@dataclass(frozen=True)
class ModeInResponse:
    """One mode of a fitted response."""

    frequency_hz: float
    damping_ratio: float
    modal_constant: float
    """R: 1/kg where calibrated; negative where sensor and hammer move against each other."""
    modal_constant_sd: float
    """From the scatter of the lines and the doubt of the pole; calibration left out."""
    skew: float
    """S, in the unit of R."""
    coherence: float | None
    """Mean over its half-power band; None for one blow."""


@dataclass(frozen=True)
class FittedResponse:
    """A frequency response made of modes."""

    modes: tuple[ModeInResponse, ...]
    below: float
    """What modes below the fitted lines leave: -1 / (w^2 m) is below / -w^2 in receptance."""
    above: float
    """What modes above them leave, as receptance."""
    derivatives: int
    misfit: float
    """Root mean square of what is left over the fitted lines, as a share of the response there."""

    def at(self, frequency_hz: Real) -> Complex:
        """(m,) response at frequencies above 0, in the quantity and unit that was fitted."""
        omega = 2 * np.pi * np.asarray(frequency_hz, float)
        total = self.below / -(omega**2) + self.above + 0j
        for mode in self.modes:
            natural = 2 * np.pi * mode.frequency_hz
            shape = 1 / (natural**2 - omega**2 + 2j * mode.damping_ratio * natural * omega)
            total += (mode.modal_constant + 1j * mode.skew * omega / natural) * shape
        return np.asarray(total * (1j * omega) ** self.derivatives)


def fit_response(
    response: FrequencyResponse, poles: Sequence[Pole], *, low_hz: float, high_hz: float
) -> FittedResponse:
    """Modal constants of known poles by weighted linear least squares on H1.

    The lines around the poles between ``low_hz`` and ``high_hz`` are fitted, each weighted by what
    its coherence says of its scatter. The poles stay as they are. Raises Refusal where no pole with
    damping lies in the band.
    """
    known = [p for p in poles if p.damping_ratio and low_hz <= p.frequency_hz <= high_hz]
    if not known:
        raise Refusal(
            "no measured mode lies where the force excites",
            "use a harder tip, or tap where the pipe moves more",
        )
    lines = fitted_lines(response, known, low_hz, high_hz)
    doubt = line_doubt(response)[lines]
    shapes = [(p.frequency_hz, float(p.damping_ratio or 0.0)) for p in known]
    numbers, covariance, left = solved(response, lines, doubt, shapes)
    spread = np.sqrt(np.diag(covariance) + from_poles(response, lines, doubt, known, numbers))
    modes = [
        ModeInResponse(
            frequency_hz,
            damping,
            float(numbers[2 * i]),
            float(spread[2 * i]),
            float(numbers[2 * i + 1]),
            coherence_near(response, frequency_hz, 2 * damping * frequency_hz),
        )
        for i, (frequency_hz, damping) in enumerate(shapes)
    ]
    share = np.linalg.norm(left) / np.linalg.norm(response.h1[lines])
    return FittedResponse(
        tuple(modes),
        float(numbers[-2]),
        float(numbers[-1]),
        derivatives_of(response),
        float(share),
    )


def derivatives_of(response: FrequencyResponse) -> int:
    """Time derivatives of displacement that its values are."""
    return DERIVATIVES.get(response.quantity, _USUAL_DERIVATIVE)


def fitted_lines(
    response: FrequencyResponse, poles: Sequence[Pole], low_hz: float, high_hz: float
) -> NDArray[np.intp]:
    """Lines near any of the poles; all there are where too few are near."""
    at = response.frequency_hz
    step_hz = float(at[1] - at[0])
    inside = (at >= low_hz) & (at <= high_hz)
    near = np.zeros(len(at), bool)
    for pole in poles:
        bandwidth_hz = 2 * float(pole.damping_ratio or 0.0) * pole.frequency_hz
        reach_hz = max(_BANDWIDTHS * bandwidth_hz, _LEAST_LINES * step_hz)
        near |= np.abs(at - pole.frequency_hz) <= reach_hz
    return np.flatnonzero(inside & near)


def line_doubt(response: FrequencyResponse) -> Real:
    """(m,) standard deviation of H1 at each line.

    With coherence c over n blows the variance is |H1|^2 (1 - c) / c / (n - 1), smoothed over
    neighbouring lines; a single blow is taken to have noise of equal strength at all lines.
    """
    size = np.abs(response.h1)
    if response.coherence is None:
        noise = np.max(size) ** 2 * np.max(response.force_power) / response.force_power
        variance = _RELATIVE_DOUBT**2 * noise
    else:
        coherence = np.clip(response.coherence, 1e-6, 1.0)
        variance = size**2 * (1 - coherence) / coherence / (response.blows - 1)
        variance = averaged(variance, _SMOOTHED_LINES)
    return np.asarray(np.sqrt(variance + (_RELATIVE_DOUBT * size) ** 2))


def averaged(values: Real, width: int) -> Real:
    """Means over a window of so many lines, shorter at the ends."""
    width = min(width, len(values))
    kernel = np.ones(width)
    return np.convolve(values, kernel, "same") / np.convolve(np.ones(len(values)), kernel, "same")


def solved(
    response: FrequencyResponse,
    lines: NDArray[np.intp],
    doubt: Real,
    shapes: Sequence[tuple[float, float]],
) -> tuple[Real, Real, Complex]:
    """(2 M + 2,) numbers of the model, their covariance, and what it leaves at the lines."""
    columns = model_columns(response, lines, shapes)
    weighted = columns / doubt[:, None]
    rows = np.concatenate([weighted.real, weighted.imag])
    target = response.h1[lines] / doubt
    size = np.maximum(np.linalg.norm(rows, axis=0), 1e-300)
    data = np.concatenate([target.real, target.imag])
    numbers, _, _, _ = np.linalg.lstsq(rows / size, data, rcond=1e-12)
    left = response.h1[lines] - columns @ (numbers / size)
    freedom = max(len(data) - len(numbers), 1)
    chi = float(np.sum(np.abs(left / doubt) ** 2)) / freedom
    inverse = np.linalg.pinv((rows / size).T @ (rows / size), hermitian=True)
    return numbers / size, max(chi, 1.0) * inverse / np.outer(size, size), left


def model_columns(
    response: FrequencyResponse,
    lines: NDArray[np.intp],
    shapes: Sequence[tuple[float, float]],
) -> Complex:
    """(l, 2 M + 2) what each number of the model adds to the response at the lines.

    A record that ends before the mode has died away lacks the rest of its decay; so do the columns.
    """
    order = derivatives_of(response)
    omega = 2 * np.pi * response.frequency_hz[lines]
    columns: list[Complex] = []
    for frequency_hz, damping in shapes:
        natural = 2 * np.pi * frequency_hz
        for extra, per in ((0, 1.0), (1, natural)):
            whole = whole_decay(omega, natural, damping, order + extra)
            lost = lost_decay(response, omega, natural, damping, order + extra)
            columns.append(np.asarray((whole - lost) / per))
    turned = (1j * omega) ** order
    columns += [np.asarray(turned / -(omega**2)), np.asarray(turned)]
    return np.array(columns).T


def whole_decay(omega: Real, natural: float, damping: float, order: int) -> Complex:
    """Response of a mode of unit modal constant, ``order`` times differentiated."""
    receptance = 1 / (natural**2 - omega**2 + 2j * damping * natural * omega)
    return np.asarray((1j * omega) ** order * receptance)


def lost_decay(
    response: FrequencyResponse, omega: Real, natural: float, damping: float, order: int
) -> Complex:
    """The part of it that lies beyond the ends of the records, each with its share."""
    turning = natural * np.sqrt(max(1 - damping**2, 1e-12))
    lost = np.zeros(len(omega), complex)
    for sign in (1.0, -1.0):
        pole = complex(-damping * natural, sign * turning)
        part = pole**order / (sign * 2j * turning) / (1j * omega - pole)
        for ring_s, share in zip(response.rings_s, response.shares, strict=True):
            lost += share * part * np.exp((pole - 1j * omega) * ring_s)
    return lost


def from_poles(
    response: FrequencyResponse,
    lines: NDArray[np.intp],
    doubt: Real,
    poles: Sequence[Pole],
    numbers: Real,
) -> Real:
    """(2 M + 2,) variance of the numbers that the doubt of the poles brings."""
    shapes = [(p.frequency_hz, float(p.damping_ratio or 0.0)) for p in poles]
    variance = np.zeros(len(numbers))
    for i, pole in enumerate(poles):
        frequency_hz, damping = shapes[i]
        sd = pole.damping_sd or 0.0
        for other in (
            (frequency_hz + pole.frequency_sd_hz, damping),
            (frequency_hz, damping + sd),
        ):
            if other != shapes[i]:
                moved = [*shapes[:i], other, *shapes[i + 1 :]]
                variance += (solved(response, lines, doubt, moved)[0] - numbers) ** 2
    return variance
