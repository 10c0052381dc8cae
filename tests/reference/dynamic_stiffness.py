"""Exact natural frequencies of straight spans in one plane: a second solver of another kind.

No mass matrix and no mesh error: each member's stiffness at the angular frequency w is exact for
the beam equation, Euler-Bernoulli or Timoshenko, with axial force. The Wittrick-Williams count
(W. H. Wittrick and F. W. Williams, Q. J. Mech. Appl. Math. 24, 1971, from memory) says how many
natural frequencies lie below w, so that bisection can miss none.

A member starts as a slice so short that a power series is exact to rounding and that it cannot
resonate between clamped ends; doubling it joins two copies and condenses the point between them,
whose negative pivots are the clamped resonances the count needs.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

SERIES_TERMS = 30
SLICE_WAVES = 1.5


@dataclass(frozen=True)
class Beam:
    """A uniform beam; shear_n infinite and rotary_kg_m zero make it slender."""

    bending_n_m2: float
    mass_kg_per_m: float
    shear_n: float = math.inf
    rotary_kg_m: float = 0.0
    tension_n: float = 0.0


@dataclass(frozen=True)
class Attachment:
    """Springs and a mass on a station; an infinite stiffness takes the motion away."""

    at_m: float
    spring_n_per_m: float = 0.0
    rotation_n_m_per_rad: float = 0.0
    mass_kg: float = 0.0


def natural_frequencies_hz(
    beam: Beam,
    length_m: float,
    attachments: Sequence[Attachment],
    count: int,
    relative_error: float = 1e-11,
) -> np.ndarray:
    """The lowest natural frequencies above zero, shape (count,), to 1e-10 of their value."""
    stations = np.unique([0.0, length_m, *(a.at_m for a in attachments)])
    rigid = _count_below(beam, stations, attachments, np.array([_start(beam, length_m)]))[0]
    top = _start(beam, length_m)
    while _count_below(beam, stations, attachments, np.array([top]))[0] < rigid + count:
        top *= 2
    low, high = np.zeros(count), np.full(count, top)
    wanted = rigid + np.arange(1, count + 1)
    for _ in range(60):
        middle = 0.5 * (low + high)
        enough = _count_below(beam, stations, attachments, middle) >= wanted
        low, high = np.where(enough, low, middle), np.where(enough, middle, high)
        if np.all(high - low < relative_error * high):
            break
    return 0.5 * (low + high) / (2 * math.pi)


def mode_count(
    beam: Beam, length_m: float, attachments: Sequence[Attachment], below_hz: float
) -> int:
    """How many natural frequencies lie above zero and below a frequency."""
    stations = np.unique([0.0, length_m, *(a.at_m for a in attachments)])
    omega = np.array([_start(beam, length_m), 2 * math.pi * below_hz])
    rigid, all_below = _count_below(beam, stations, attachments, omega)
    return int(all_below - rigid)


def deflections(
    beam: Beam,
    length_m: float,
    attachments: Sequence[Attachment],
    frequency_hz: np.ndarray,
    at_m: Sequence[float],
) -> np.ndarray:
    """Deflection at some stations in each mode, shape (modes, stations), any scale.

    Every stiffness must be finite. At a natural frequency the dynamic stiffness has no resistance
    against the mode: the vector of its least eigenvalue.
    """
    stations = np.unique([0.0, length_m, *(a.at_m for a in attachments), *at_m])
    omega = 2 * math.pi * np.asarray(frequency_hz)
    whole, _ = _whole(beam, stations, attachments, omega)
    scale = 1 / np.sqrt(np.abs(np.diagonal(whole, axis1=1, axis2=2)))
    value, vector = np.linalg.eigh(scale[:, :, None] * whole * scale[:, None, :])
    least = np.argmin(np.abs(value), axis=1)
    shape = scale * np.take_along_axis(vector, least[:, None, None], axis=2)[:, :, 0]
    rows = [2 * int(np.argmin(np.abs(stations - station))) for station in at_m]
    return shape[:, rows]


def _start(beam: Beam, length_m: float) -> float:
    """An angular frequency below every elastic mode that matters (b = 0.05)."""
    return (0.05 / length_m) ** 2 * math.sqrt(beam.bending_n_m2 / beam.mass_kg_per_m)


def _count_below(beam, stations, attachments, omega):
    """How many natural frequencies lie below each angular frequency, shape of omega."""
    whole, inside = _whole(beam, stations, attachments, omega)
    return inside.sum(axis=1) + _negative_pivots(whole)


def _whole(beam, stations, attachments, omega):
    """Dynamic stiffness of what is free to move, and resonances of the members held at both ends.

    Shapes (W, 2 stations - held, the same), deflection and slope in turn; and (W, members).
    """
    lengths = np.diff(stations)
    stiffness, inside = _members(beam, lengths, omega)
    size = 2 * len(stations)
    whole = np.zeros((len(omega), size, size))
    for i in range(len(lengths)):
        whole[:, 2 * i : 2 * i + 4, 2 * i : 2 * i + 4] += stiffness[:, i]
    kept = np.ones(size, dtype=bool)
    for attached in attachments:
        row = 2 * int(np.argmin(np.abs(stations - attached.at_m)))
        kept[row] &= math.isfinite(attached.spring_n_per_m)
        kept[row + 1] &= math.isfinite(attached.rotation_n_m_per_rad)
        inertia = attached.mass_kg * omega**2
        whole[:, row, row] += np.nan_to_num(attached.spring_n_per_m, posinf=0.0) - inertia
        whole[:, row + 1, row + 1] += np.nan_to_num(attached.rotation_n_m_per_rad, posinf=0.0)
    return whole[:, kept][:, :, kept], inside


def _members(beam, lengths, omega):
    """Dynamic stiffness (W, members, 4, 4) and clamped resonances below omega (W, members)."""
    waves = np.sqrt(np.max(omega)) * (beam.mass_kg_per_m / beam.bending_n_m2) ** 0.25 * lengths
    doublings = max(0, math.ceil(math.log2(np.max(waves) / SLICE_WAVES)))
    stiffness = _slices(beam, lengths / 2**doublings, omega)
    resonances = np.zeros(stiffness.shape[:2], dtype=int)
    for _ in range(doublings):
        stiffness, between = _doubled(stiffness)
        resonances = 2 * resonances + between
    return stiffness, resonances


def _doubled(stiffness):
    near, far = slice(0, 2), slice(2, 4)
    middle = stiffness[..., far, far] + stiffness[..., near, near]
    joined = np.zeros_like(stiffness)
    joined[..., near, near] = stiffness[..., near, near]
    joined[..., far, far] = stiffness[..., far, far]
    coupling = np.concatenate([stiffness[..., far, near], stiffness[..., near, far]], axis=-1)
    joined -= np.swapaxes(coupling, -1, -2) @ np.linalg.solve(middle, coupling)
    return joined, _negative_pivots(middle)


def _negative_pivots(matrices):
    return np.sum(np.linalg.eigvalsh(matrices) < 0, axis=-1)


def _slices(beam, lengths, omega):
    """Stiffness of short slices by the power series of their transfer matrix.

    State w/h, psi, V h^2/EI, M h/EI along the slice of length h:
    w' = psi + V/S, psi' = M/EI, V' = -m omega^2 w, M' = -V + (P - rho I omega^2) psi.
    """
    h, w2 = lengths[None, :], omega[:, None] ** 2
    rate = np.zeros((len(omega), len(lengths), 4, 4))
    rate[..., 0, 1] = 1.0
    rate[..., 0, 2] = beam.bending_n_m2 / (beam.shear_n * h**2)
    rate[..., 1, 3] = 1.0
    rate[..., 2, 0] = -w2 * beam.mass_kg_per_m * h**4 / beam.bending_n_m2
    rate[..., 3, 1] = (beam.tension_n - w2 * beam.rotary_kg_m) * h**2 / beam.bending_n_m2
    rate[..., 3, 2] = -1.0
    transfer = term = np.broadcast_to(np.eye(4), rate.shape)
    for n in range(1, SERIES_TERMS):
        term = term @ rate / n
        transfer = transfer + term
    start, end = slice(0, 2), slice(2, 4)
    to_end = np.linalg.inv(transfer[..., start, end])
    from_start = -to_end @ transfer[..., start, start]
    stiffness = np.empty_like(rate)
    stiffness[..., start, start] = -from_start
    stiffness[..., start, end] = -to_end
    stiffness[..., end, start] = transfer[..., end, start] + transfer[..., end, end] @ from_start
    stiffness[..., end, end] = transfer[..., end, end] @ to_end
    scale = np.stack([1 / h, np.ones_like(h), 1 / h, np.ones_like(h)], axis=-1)
    unit = beam.bending_n_m2 / h[..., None, None]
    return unit * scale[..., :, None] * stiffness * scale[..., None, :]
