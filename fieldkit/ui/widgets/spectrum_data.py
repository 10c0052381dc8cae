"""What a spectrum plot is given to show, and how values are read from it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from fieldkit.ui.widgets.band_art import BandShade
from fieldkit.ui.widgets.view_range import Axis

Floats = NDArray[np.float64]
MarkKind = Literal["mode", "tone", "refused", "model"]
ROLES = ("measured", "second", "background", "model")
"""Roles of a curve, told apart by colour and by a full, dashed, dotted or broken line."""


@dataclass(frozen=True)
class Curve:
    """One amplitude against frequency."""

    frequency_hz: Floats
    """(m,) rising."""
    amplitude: Floats
    """(m,) zero or more; NaN breaks the line."""
    label: str = ""
    role: str = "measured"
    """One of ROLES; any other is drawn like ``measured``."""
    letter: str = ""
    """Stands on the curve and in the legend where several are drawn."""


@dataclass(frozen=True)
class Mark:
    """A frequency to point at; the plot writes its number, ``label`` says what else to write."""

    frequency_hz: float
    label: str = ""
    kind: MarkKind = "mode"


@dataclass(frozen=True)
class SpectrumData:
    """Everything on one spectrum plot."""

    curves: tuple[Curve, ...] = ()
    marks: tuple[Mark, ...] = ()
    bands: tuple[BandShade, ...] = ()
    amplitude_unit: str = ""
    up_to_hz: float | None = None
    """Upper end of what is looked at first; None lets the marks and bands decide."""

    @property
    def empty(self) -> bool:
        """Whether there is nothing to draw."""
        return not any(len(curve.frequency_hz) for curve in self.curves) and not self.marks

    @property
    def highest_hz(self) -> float:
        """Upper end of everything there is; above zero."""
        return _highest([*self._ends_of_curves, *self._named_hz, self.up_to_hz or 0.0]) or 100.0

    @property
    def home_hz(self) -> float:
        """Upper end of what is looked at first."""
        if self.up_to_hz is not None and self.up_to_hz > 0:
            return min(self.up_to_hz, self.highest_hz)
        named = _highest(self._named_hz)
        return min(1.25 * named, self.highest_hz) if named else self.highest_hz

    @property
    def lowest_positive_hz(self) -> float:
        """Where a logarithmic axis starts: the first line above zero, at most 400 times below."""
        lines = [c.frequency_hz[c.frequency_hz > 0][:1] for c in self.curves]
        first = min((float(line[0]) for line in lines if len(line)), default=0.0)
        return max(first, self.home_hz / 400)

    def limits(self, log: bool) -> Axis:
        """As far as a view may go."""
        low = self.lowest_positive_hz if log else 0.0
        return Axis(low, max(self.highest_hz, 1.01 * low), log)

    def home(self, log: bool) -> Axis:
        """What is looked at first."""
        low = self.lowest_positive_hz if log else 0.0
        return Axis(low, max(self.home_hz, 1.01 * low), log)

    @property
    def _ends_of_curves(self) -> list[float]:
        return [float(c.frequency_hz[-1]) for c in self.curves if len(c.frequency_hz)]

    @property
    def _named_hz(self) -> list[float]:
        return [m.frequency_hz for m in self.marks] + [b.avoid_high_hz for b in self.bands]


def _highest(frequencies_hz: Sequence[float]) -> float:
    return max((f for f in frequencies_hz if np.isfinite(f)), default=0.0)


def highest_between(curve: Curve, low_hz: float, high_hz: float) -> tuple[float, float] | None:
    """(frequency_hz, amplitude) of the highest line between two frequencies.

    Where no line lies between them the curve is read at their middle; None outside the curve.
    """
    first, end = np.searchsorted(curve.frequency_hz, [low_hz, high_hz])
    inside = curve.amplitude[first:end]
    if len(inside) and np.isfinite(inside).any():
        best = first + int(np.nanargmax(inside))
        return float(curve.frequency_hz[best]), float(curve.amplitude[best])
    if len(curve.frequency_hz) == 0:
        return None
    middle = 0.5 * (low_hz + high_hz)
    value = np.interp(middle, curve.frequency_hz, curve.amplitude, left=np.nan, right=np.nan)
    return (middle, float(value)) if np.isfinite(value) else None
