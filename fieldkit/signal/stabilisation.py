"""Which poles come back at many model orders."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Complex = NDArray[np.complex128]

_HIGHEST_DAMPING = 0.2
_APART = 0.7
"""Two poles are one mode when they are nearer than this share of their mean decay rate."""
LEAST_SHARE = 0.4
"""A stable pole is there at this share of the orders or more."""


@dataclass(frozen=True)
class StablePole:
    """A pole that several model orders agree about."""

    pole: complex
    """1/s, the median."""
    hits: int
    orders: int

    @property
    def frequency_hz(self) -> float:
        """Undamped natural frequency."""
        return float(abs(self.pole) / (2 * np.pi))

    @property
    def stable(self) -> bool:
        """Whether enough orders show it."""
        return self.hits >= LEAST_SHARE * self.orders


def stabilised(by_order: Sequence[Complex]) -> list[StablePole]:
    """Groups of poles (one array for each order), those with most hits first."""
    orders = len(by_order)
    flat = [(p, n) for n, poles in enumerate(by_order) for p in poles if _plausible(p)]
    poles = np.array([p for p, _ in flat], dtype=complex)
    order = np.array([n for _, n in flat], dtype=int)
    found = []
    while len(poles):
        near = _near(poles)
        hits = np.array([len(set(order[row])) for row in near])
        members = near[int(np.argmax(hits))]
        found.append(StablePole(_middle(poles[members]), int(hits.max()), orders))
        poles, order = poles[~members], order[~members]
    return found


def distinct(poles: Sequence[StablePole]) -> list[StablePole]:
    """Poles seen in two bands once, as the one with more hits."""
    kept: list[StablePole] = []
    for found in sorted(poles, key=lambda p: -p.hits):
        near = (abs(found.pole - other.pole) < -_APART * other.pole.real for other in kept)
        if not any(near):
            kept.append(found)
    return kept


def _plausible(pole: complex) -> bool:
    return -pole.real < _HIGHEST_DAMPING * abs(pole)


def _near(poles: Complex) -> NDArray[np.bool_]:
    """(n, n) whether two poles lie within a share of their decay rates."""
    decay = -poles.real
    apart = np.abs(poles[:, None] - poles[None, :])
    return np.asarray(apart < _APART * 0.5 * (decay[:, None] + decay[None, :]))


def _middle(poles: Complex) -> complex:
    return complex(-np.exp(np.median(np.log(-poles.real))), np.median(poles.imag))
