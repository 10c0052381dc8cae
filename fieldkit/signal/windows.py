"""Cosine-sum windows for spectra, in their periodic form."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class Window:
    """A sum of cosines: ``a0 - a1 cos(x) + a2 cos(2x) - ...`` with x = 2 pi i / n."""

    name: str
    coefficients: tuple[float, ...]

    def samples(self, n: int) -> NDArray[np.float64]:
        """The window (n,), periodic over n."""
        x = 2 * np.pi * np.arange(n) / n
        terms = [(-1) ** k * a * np.cos(k * x) for k, a in enumerate(self.coefficients)]
        total: NDArray[np.float64] = np.sum(terms, axis=0)
        return total

    @property
    def noise_bandwidth_bins(self) -> float:
        """Equivalent noise bandwidth in lines, for any n above twice the number of terms."""
        a = np.array(self.coefficients)
        return float(1 + np.sum(a[1:] ** 2) / (2 * a[0] ** 2))

    @property
    def half_width_bins(self) -> int:
        """Distance from the top of a line to the first zero beside it, in lines."""
        return len(self.coefficients)

    def response(self, offset_bins: float) -> float:
        """What a steady sine reads, as a share of its level, off a line by this many lines.

        Holds for n much larger than the offset.
        """
        d = float(offset_bins)
        lobes = [a * (np.sinc(d + k) + np.sinc(d - k)) / 2 for k, a in enumerate(self.coefficients)]
        return float(abs(sum(lobes)) / self.coefficients[0])


RECTANGULAR = Window("rectangular", (1.0,))
HANN = Window("Hann", (0.5, 0.5))
FLAT_TOP = Window(
    "flat-top, 5 terms", (0.21557895, 0.41663158, 0.277263158, 0.083578947, 0.006947368)
)
"""D'Antona and Ferrero 2006, Digital Signal Processing for Measurement Systems, p. 70."""
HFT90D = Window("HFT90D", (1.0, 1.942604, 1.340318, 0.440811, 0.043097))
"""Flat-top of Heinzel, Ruediger and Schilling 2002, Spectrum and spectral density estimation by
the discrete Fourier transform: side lobes below -90.2 dB, a sine reads within 0.0039 dB."""
