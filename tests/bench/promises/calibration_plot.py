"""Promised chance against the share that was kept, as a picture."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from tests.bench.promises.tally import FIFTHS, Tally
from tests.bench.promises.trial import Trial

Z_90 = 1.645
COLOURS = ("#0b5fa5", "#c2571a")


def plot(trials: Sequence[Trial], path: Path) -> None:
    """Fifths of the scale with their 90 % intervals; below it how many promises each holds."""
    import matplotlib as mpl

    mpl.use("svg")
    mpl.rcParams["svg.hashsalt"] = "promises"
    from matplotlib import pyplot

    figure, (upper, lower) = pyplot.subplots(
        2, 1, figsize=(6.4, 7.6), sharex=True, height_ratios=(4, 1), layout="constrained"
    )
    upper.plot([0, 1], [0, 1], color="0.4", linewidth=1)
    ways = list(dict.fromkeys(trial.way for trial in trials))
    for i, (way, colour) in enumerate(zip(ways, COLOURS, strict=False)):
        tally = Tally([trial for trial in trials if trial.way == way])
        draw(upper, tally, way, colour)
        promised = [p for p, _ in tally.first]
        lower.hist(
            promised, bins=np.linspace(0, 1, 21), color=colour, alpha=0.6, rwidth=0.9 - 0.2 * i
        )
    upper.set(ylabel="share kept by the hidden pipe", xlim=(0, 1.02), ylim=(0, 1.02))
    lower.set(xlabel="promised chance of the first change", ylabel="spans")
    for panel in (upper, lower):
        panel.grid(alpha=0.3)
    upper.legend(loc="upper left", frameon=False)
    figure.savefig(path, metadata={"Date": None})
    pyplot.close(figure)


def draw(panel, tally: Tally, label: str, colour: str) -> None:  # type: ignore[no-untyped-def]
    """One dot for each fifth that holds anything."""
    stretches = [tally.between(low, high) for low, high in FIFTHS]
    filled = [(np.mean(p), *interval(k)) for p, k in stretches if k]
    if not filled:
        return
    x, middle, low, high = np.array(filled).T
    reach = [middle - low, high - middle]
    panel.errorbar(x, middle, reach, fmt="o-", color=colour, capsize=3, label=label)


def interval(kept: Sequence[bool]) -> tuple[float, float, float]:
    """Share and its 90 % interval (Wilson 1927, J. Am. Stat. Assoc. 22, 209, from memory)."""
    n, p = len(kept), float(np.mean(kept))
    scale = 1 + Z_90**2 / n
    centre = (p + Z_90**2 / (2 * n)) / scale
    reach = Z_90 * np.sqrt(p * (1 - p) / n + Z_90**2 / (4 * n**2)) / scale
    return p, min(centre - reach, p), max(centre + reach, p)
