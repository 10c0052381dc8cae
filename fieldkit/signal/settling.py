"""Does a decay keep its pole? The same mode once more, from later in its decay.

Where decays are not exactly exponential, what the room or the mounting adds dies away before the
mode does. Early and late part then tell different poles, by more than either admits.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from fieldkit.signal.clusters import fit_together
from fieldkit.signal.covariance import Estimate, PoleEstimate, shared_estimates
from fieldkit.signal.polish import Fitted
from fieldkit.signal.scan import Region
from fieldkit.signal.scatter import scattered
from fieldkit.signal.traces import Component, Trace, residual

_LATER_DECAYS = 1.0
_LATEST = 1 / 3
"""Of the record, from where the later part starts at the latest."""


def with_later(
    traces: Sequence[Trace], parts: Sequence[Component], fitted: Sequence[Fitted], region: Region
) -> tuple[Fitted, ...]:
    """Every fitted mode with its fit from one decay time on."""
    return tuple(replace(f, later=later(traces, parts, f, region)) for f in fitted)


def later(
    traces: Sequence[Trace], parts: Sequence[Component], fitted: Fitted, region: Region
) -> Fitted | None:
    """The mode fitted alone from one decay time on; None for what has no pole of its own."""
    part = fitted.part
    if part.steady or part.bend or scattered(part):
        return None
    start_s = min(_LATER_DECAYS / part.decay_per_s, *(_LATEST * t.duration_s for t in traces))
    rest = [p for p in parts if p.pole != part.pole]
    tails = [
        replace(t, samples=residual(t, k, rest)[int(start_s * t.rate_hz) :], spectra={})
        for k, t in enumerate(traces)
    ]
    fit = fit_together(tails, [part], [], region.high_hz, leftover_terms=0)
    return Fitted(fit.active[0], fit, 0)


def amid(estimate: PoleEstimate, fitted: Fitted) -> PoleEstimate:
    """Between what the whole decay and its later part say, as unsure as they differ."""
    if fitted.later is None:
        return estimate
    frequency, damping = shared_estimates(fitted.later)
    return replace(
        estimate,
        frequency_hz=between(estimate.frequency_hz, frequency),
        damping_ratio=between(estimate.damping_ratio, damping),
    )


def between(whole: Estimate, late: Estimate) -> Estimate:
    """Halfway, as far as the difference exceeds the doubt of the later value."""
    apart = late.value - whole.value
    excess = float(np.sqrt(max(apart**2 - late.sd**2, 0.0)))
    return Estimate(
        whole.value + float(np.sign(apart)) * excess / 2, float(np.hypot(whole.sd, excess / 2))
    )
