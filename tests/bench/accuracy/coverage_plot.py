"""Stated probability against the share of truths that fall inside, as a picture."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tests.bench.accuracy.tally import Tally
from tests.bench.accuracy.trial import WAYS, Trial

Real = NDArray[np.float64]

_STATED = np.linspace(0.005, 0.995, 199)
_SIMULTANEOUS_95 = 1.36
"""Largest distance of a true distribution from a sampled one, times the root of the number
(Kolmogorov 1933)."""


def plot(trials: Sequence[Trial], path: Path) -> None:
    """Draw one panel for frequency and one for damping, both ways of estimating in each."""
    import matplotlib as mpl

    mpl.use("svg")
    mpl.rcParams["svg.hashsalt"] = "coverage"
    from matplotlib import pyplot

    figure, panels = pyplot.subplots(1, 2, figsize=(10, 5.2), sharey=True, layout="constrained")
    for panel, name in zip(panels, ("frequency", "damping"), strict=True):
        panel.plot([0, 1], [0, 1], color="0.4", linewidth=1)
        both = {way: scores(trials, way, name) for way in WAYS}
        chance = _SIMULTANEOUS_95 / np.sqrt(max(*map(len, both.values()), 1))
        label = "what chance alone would do"
        low, high = _STATED - chance, _STATED + chance
        panel.fill_between(_STATED, low, high, color="0.85", linewidth=0, label=label)
        for (way, values), colour in zip(both.items(), ("#0b5fa5", "#c2571a"), strict=True):
            draw(panel, values, way, colour)
        panel.set(title=name, xlabel="stated probability of an interval", xlim=(0, 1), ylim=(0, 1))
        panel.set_aspect("equal")
        panel.grid(alpha=0.3)
        panel.legend(loc="upper left", frameon=False)
    panels[0].set_ylabel("share of intervals that hold the truth")
    figure.savefig(path, metadata={"Date": None})
    pyplot.close(figure)


def draw(panel, values: Real, label: str, colour: str) -> None:  # type: ignore[no-untyped-def]
    """One curve, with a dot at 95 %."""
    panel.plot(
        _STATED,
        held(values, _STATED),
        color=colour,
        linewidth=2,
        label=f"{label}, {len(values)} modes",
    )
    at_95 = float(held(values, np.array([0.95]))[0])
    panel.plot([0.95], [at_95], "o", color=colour)


def scores(trials: Sequence[Trial], way: str, name: str) -> Real:
    """Errors in stated standard deviations."""
    found = Tally(tuple(trial.scores[way] for trial in trials if way in trial.scores)).found
    return np.array(
        [m.frequency_score if name == "frequency" else m.damping_score for m in found], float
    )


def held(values: Real, stated: Real) -> Real:
    """Share of truths within the two-sided normal interval of each stated probability."""
    from scipy.special import ndtri

    reach = ndtri((1 + stated) / 2)
    return np.mean(np.abs(values)[None, :] <= reach[:, None], axis=1)
