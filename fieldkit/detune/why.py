"""Why a change works and what would make it fail, each in one sentence."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from fieldkit.detune.excitation import Band
from fieldkit.detune.judge import Spectrum
from fieldkit.detune.screen import merged

Array = NDArray[np.float64]


def interval_name(interval: tuple[float, float], bands: Sequence[Band]) -> str:
    """The excitations whose widened bands make up an interval."""
    low, high = interval
    names = [b.name for b in bands if b.avoid_low_hz <= high and b.avoid_high_hz >= low]
    return " and ".join(dict.fromkeys(names))


def why(before: Spectrum, after: Spectrum, bands: Sequence[Band], up_to_hz: float) -> str:
    """What the change does to the modes that lie in the bands now, by the medians."""
    now, then = _rising(before), _rising(after)
    moved: dict[str, list[int]] = {}
    for low, high in merged(bands, up_to_hz):
        name = interval_name((low, high), bands)
        for n in np.flatnonzero((now >= low) & (now <= high)):
            if n >= len(then) or then[n] > high:
                text = f"lifts {{}} above {name}"
            else:
                text = f"lowers {{}} below {name}" if then[n] < low else f"leaves {{}} in {name}"
            moved.setdefault(text, []).append(int(n))
    if not moved:
        return "no mode is likely to lie in a band now; it makes more room"
    return ", and ".join(text.format(_modes(modes, now, then)) for text, modes in moved.items())


def _modes(modes: Sequence[int], now: Array, then: Array) -> str:
    word = "modes" if len(modes) > 1 else "mode"
    numbers = ", ".join(str(n + 1) for n in modes)
    before = ", ".join(f"{now[n]:.1f}" for n in modes)
    shown = [f"{then[n]:.1f}" for n in modes if n < len(then)]
    if len(shown) < len(modes):
        return f"{word} {numbers} ({before} Hz)"
    return f"{word} {numbers} ({before} to {', '.join(shown)} Hz)"


def fails(after: Spectrum, bands: Sequence[Band], up_to_hz: float) -> str:
    """The mode and band edge that most members fall to, or come nearest to."""
    worst: tuple[float, float, str] | None = None
    median = _rising(after)
    for low, high in merged(bands, up_to_hz):
        name = interval_name((low, high), bands)
        for n, hertz in enumerate(median):
            own = _numbered(after, n)
            inside = float(np.mean((own >= low) & (own <= high)))
            edge = high if hertz > 0.5 * (low + high) else low
            key = (-inside, abs(np.log(hertz / edge)))
            side = "below" if hertz > edge else "above"
            if low <= hertz <= high:
                side = "still above" if edge == low else "still below"
            text = (
                f"fails if mode {n + 1}, expected at {hertz:.1f} Hz, lies {side} {edge:.1f} Hz "
                f"({name})"
            )
            if worst is None or key < worst[:2]:
                worst = (*key, text)
    return worst[2] if worst else ""


def _rising(spectrum: Spectrum) -> Array:
    """(modes,) median of each mode by number, free directions left out."""
    alive = np.sum(~np.isnan(spectrum.all_hz), axis=0)
    kept = np.sort(spectrum.all_hz, axis=1)[:, : int((alive > 0).sum())]
    enough = np.mean(~np.isnan(kept), axis=0) > 0.5
    return np.asarray(np.nanmedian(kept[:, enough], axis=0))


def _numbered(spectrum: Spectrum, n: int) -> Array:
    """(members,) frequency of the nth mode."""
    return np.asarray(np.sort(spectrum.all_hz, axis=1)[:, n])
