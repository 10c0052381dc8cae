"""Which taps do not decay freely: struck again unnoticed, touched, or moved."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.leftovers import MANY_OF_ITS_OWN, own_components
from fieldkit.signal.polish import Fitted

Real = NDArray[np.float64]

_POOR = 4.0
"""Residual over expected noise variance of a tap that the others' modes do not explain."""
_OVER_OTHERS = 4.0


def odd_taps(fitted: Sequence[Fitted], taps: int) -> NDArray[np.bool_]:
    """(K,) True for taps whose residual stands far above the noise and above the other taps'.

    With fewer than three taps nobody can say which one is odd: none is.
    """
    if taps < 3 or not fitted:
        return np.zeros(taps, bool)
    misfit = tap_misfit(fitted, taps)
    odd = (misfit > _POOR) & (misfit > _OVER_OTHERS * np.median(misfit))
    odd |= own_components([f.part for f in fitted], taps) >= MANY_OF_ITS_OWN
    return np.asarray(odd & (np.count_nonzero(odd) <= taps - 2))


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
