"""Poles that differ from tap to tap: a support with play, a clamp that settles."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from fieldkit.signal.clusters import fit_together
from fieldkit.signal.likelihood import Fit, inverse
from fieldkit.signal.traces import Component, Trace

_FORESEEN = 0.3
"""Share of what poles of their own save that is seen to first order, at least."""


@dataclass(frozen=True)
class Loose:
    """Components fitted with poles of their own in each tap."""

    parts: tuple[Component, ...]
    fits: tuple[Fit, ...]
    """One for each tap."""

    @property
    def cost(self) -> float:
        """Chi-squared of all taps."""
        return sum(f.cost for f in self.fits)

    @property
    def variance(self) -> float:
        """Residual over expected noise variance."""
        return self.cost / max(sum(f.freedom for f in self.fits), 1)


def scattered(part: Component) -> bool:
    """True for a component whose poles differ between taps."""
    return bool(np.ptp(part.poles.imag) > 0 or np.ptp(part.poles.real) > 0)


def disagreement(fit: Fit) -> float:
    """How much the cost would fall, to first order, if every tap had poles of its own."""
    slopes = fit.tap_gradient[:, :, None]
    moves = inverse(fit.tap_information) @ slopes
    return float(np.sum(slopes * moves))


def loosened(
    traces: Sequence[Trace],
    parts: Sequence[Component],
    others: Sequence[Component],
    top_hz: float,
    around: Sequence[Component],
) -> Loose:
    """Fit the parts in each tap alone, over the bins that suit ``around``."""
    fits = []
    for k, trace in enumerate(traces):
        own, rest = [only(p, k) for p in parts], [only(o, k) for o in others]
        near = [only(a, k) for a in around]
        fits.append(fit_together([trace], own, rest, top_hz, over=near))
    together = [gathered(p, [f.active[i] for f in fits]) for i, p in enumerate(parts)]
    return Loose(tuple(together), tuple(fits))


def looser(
    traces: Sequence[Trace],
    near: Sequence[Component],
    rest: Sequence[Component],
    top_hz: float,
    shared: Fit,
    around: Sequence[Component],
    least: float = 0.0,
) -> Loose | None:
    """Near modes with poles of their own in every tap.

    None where the taps agree, or where that would not save ``least`` of the cost by far.
    """
    if not near or len(traces) < 2:
        return None
    already = any(scattered(n) for n in near)
    price = freedom_price(near, len(traces), shared.freedom)
    if not already and disagreement(shared) < max(price, _FORESEEN * least):
        return None
    return loosened(traces, near, rest, top_hz, around)


def freedom_price(near: Sequence[Component], taps: int, freedom: int) -> float:
    """Gain that poles of their own in every tap must bring (Bayesian information criterion)."""
    return 2 * len(near) * (taps - 1) * float(np.log(max(freedom, 2)))


def only(part: Component, tap: int) -> Component:
    """A component as one tap has it."""
    at = slice(tap, tap + 1)
    return replace(
        part, poles=part.poles[at], amplitudes=part.amplitudes[at], slopes=part.slopes[at]
    )


def gathered(part: Component, by_tap: Sequence[Component]) -> Component:
    """The component of all taps from one of each."""
    return replace(
        part,
        poles=np.concatenate([t.poles for t in by_tap]),
        amplitudes=np.concatenate([t.amplitudes for t in by_tap]),
    )
