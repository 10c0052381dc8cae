"""A waterfall in words, as a table and as a document."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from fieldkit.detune.excitation import Band, excitation_band
from fieldkit.signal.waterfall import Waterfall

ROWS = 16


def reading(found: Waterfall, orders: Sequence[Band]) -> str:
    """Whether the strongest line moves, how far, and what that says."""
    low, middle, high = np.quantile(found.strongest_hz, (0.05, 0.5, 0.95))
    order = excitation_band(float(middle), tuple(orders))
    on = f" on {order.name}" if order else ""
    if found.steady:
        return (
            f"The strongest line holds {middle:.1f} Hz{on} within {100 * found.moves:.1f} %: "
            "the speed does not change."
        )
    follows = _level_follows(found)
    return (
        f"The strongest line moves from {low:.1f} to {high:.1f} Hz, {100 * found.moves:.0f} %: "
        f"the speed changes, or another line takes over.{follows}"
    )


def _level_follows(found: Waterfall) -> str:
    """Where it is strongest, if the level depends on where the line is."""
    weak, strong = np.quantile(found.strongest_rms, (0.1, 0.9))
    if strong < 2 * max(float(weak), 1e-300):
        return ""
    at = float(found.strongest_hz[int(np.argmax(found.strongest_rms))])
    return f" It is strongest at {at:.1f} Hz: look for a mode there."


def time_text(time_s: float) -> str:
    """Minutes and seconds."""
    minutes, rest = divmod(time_s, 60)
    return f"{int(minutes)}:{rest:04.1f}" if minutes else f"{rest:.1f} s"


def at_words(found: Waterfall, i: int, orders: Sequence[Band]) -> str:
    """One stretch in a line."""
    hertz = float(found.strongest_hz[i])
    order = excitation_band(hertz, tuple(orders))
    on = f" ({order.name})" if order else ""
    return (
        f"{time_text(float(found.time_s[i]))}: strongest {hertz:.2f} Hz{on}, "
        f"{found.strongest_rms[i]:.3g} {found.unit} RMS"
    )


def lines(file: str, found: Waterfall, orders: Sequence[Band]) -> list[str]:
    """The strongest line against time, with a bar for its level."""
    shown = np.unique(np.rint(np.linspace(0, len(found.time_s) - 1, ROWS)).astype(int))
    largest = float(found.strongest_rms.max()) or 1.0
    rows = [
        f"{time_text(float(found.time_s[i])):>8}  {found.strongest_hz[i]:9.2f}  "
        f"{found.strongest_rms[i]:10.3g}  {'█' * round(30 * found.strongest_rms[i] / largest)}"
        for i in shown
    ]
    head = f"{'time':>8}  {'strongest':>9}  {'RMS':>10}"
    units = f"{'':>8}  {'Hz':>9}  {found.unit:>10}"
    return [file, head, units, *rows, "", reading(found, orders)]


def document(file: str, found: Waterfall, orders: Sequence[Band]) -> Mapping[str, Any]:
    """The strongest line of each stretch; the picture itself is left out."""
    return {
        "file": file,
        "unit": found.unit,
        "resolution_hz": found.resolution_hz,
        "time_s": found.time_s.tolist(),
        "strongest_hz": found.strongest_hz.tolist(),
        "strongest_rms": found.strongest_rms.tolist(),
        "steady": found.steady,
        "reading": reading(found, orders),
    }
