"""Which taps do not decay freely: struck again unnoticed, touched, or moved."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.polish import Fitted

Real = NDArray[np.float64]

_POOR = 4.0
"""Residual over expected noise variance of a tap that the others' modes do not explain."""
_OVER_OTHERS = 4.0
_MANY_OF_ITS_OWN = 3
_ALMOST_ALL = 0.9
_RINGS = 0.2


def odd_taps(fitted: Sequence[Fitted], taps: int) -> NDArray[np.bool_]:
    """(K,) True for taps whose residual stands far above the noise and above the other taps'.

    With fewer than three taps nobody can say which one is odd: none is.
    """
    if taps < 3 or not fitted:
        return np.zeros(taps, bool)
    misfit = tap_misfit(fitted, taps)
    odd = (misfit > _POOR) & (misfit > _OVER_OTHERS * np.median(misfit))
    odd |= own_components(fitted, taps) >= _MANY_OF_ITS_OWN
    return np.asarray(odd & (np.count_nonzero(odd) <= taps - 2))


def own_components(fitted: Sequence[Fitted], taps: int) -> NDArray[np.int64]:
    """(K,) how many components ring in one tap almost alone."""
    count = np.zeros(taps, int)
    for part in (f.part for f in fitted if f.part.damping_ratio < _RINGS):
        energy = np.abs(part.amplitudes) ** 2
        top = int(np.argmax(energy))
        count[top] += energy[top] > _ALMOST_ALL * energy.sum()
    return count


def tap_misfit(fitted: Sequence[Fitted], taps: int) -> Real:
    """(K,) residual over expected noise variance, all fits together, of modes at their best."""
    fits = {id(f.fit): f for f in fitted}.values()
    cost = sum((tap_costs(f) for f in fits), start=np.zeros(taps))
    data = sum(max(f.fit.freedom, 1) / taps for f in fits)
    return np.asarray(cost / data)


def tap_costs(fitted: Fitted) -> Real:
    """(K,) chi-squared of each tap, with poles of its own where those differ."""
    if fitted.tap_fits:
        return np.array([fit.cost for fit in fitted.tap_fits])
    return fitted.fit.tap_cost
