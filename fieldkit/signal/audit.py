"""Which taps do not decay freely: struck again unnoticed, touched, or moved."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.signal.leftovers import MANY_OF_ITS_OWN, own_components
from fieldkit.signal.polish import Fitted

Real = NDArray[np.float64]

_POOR = 4.0
"""Residual over expected noise variance of a tap that the others' modes do not explain."""
_OVER_OTHERS = 4.0
_GOOD = 2.0
_SHORTER = 0.7
_SHORTEST_S = 0.4
_STILL_FALLS = 0.5
"""In two steps: the first may leave more of the same blow in less of a record."""


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


def typical_misfit(fitted: Sequence[Fitted], taps: int) -> float:
    """Residual over noise variance that more than half of the taps reach; 1 without a fit."""
    return float(np.quantile(tap_misfit(fitted, taps), 0.5, method="lower")) if fitted else 1.0


def free_until(
    durations_s: Sequence[float], misfit: float, misfit_until: Callable[[float], float]
) -> float | None:
    """How long the taps decay freely, where decays explain little of most of them as a whole.

    Blows that nobody noticed make decays unlike any sum of modes, or like modes that are not there;
    what lies before the first of them does not show them. None where all is free, or where shorter
    records are no better explained: then it is no matter of time.
    """
    if misfit <= _POOR:
        return None
    misfits = [misfit]
    until_s = _SHORTER * float(np.median(durations_s))
    while until_s > _SHORTEST_S:
        misfits.append(misfit_until(until_s))
        if misfits[-1] < _GOOD:
            return until_s
        if len(misfits) > 2 and misfits[-1] > _STILL_FALLS * misfits[-3]:
            return None
        until_s *= _SHORTER
    return None


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
