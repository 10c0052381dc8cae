"""Numbers as a person reads them on a narrow screen."""

from __future__ import annotations

import math

from fieldkit.sheet.plain import clean

DASH = "–"
SIMULATED = "◆ SIMULATED ◆"
"""Stands before every title that rests on the practice rig."""


def decimals_for(sd: float) -> int:
    """Decimals that show a standard deviation with one figure, two where it starts with 1."""
    if not sd > 0:
        return 2
    first = math.floor(math.log10(sd))
    leading = sd / 10**first
    return max(0, -first + (1 if leading < 1.95 else 0))


def plus_minus(value: float, sd: float, most: int = 3) -> str:
    """``23.41 ±0.02``: as many decimals as the doubt allows, ``most`` at most."""
    decimals = min(most, decimals_for(sd))
    least = 10.0**-decimals
    doubt = f"<{least:.{decimals}f}" if 0 < sd < least / 2 else f"{sd:.{decimals}f}"
    return f"{value:.{decimals}f} ±{doubt}"


def hertz(value_hz: float) -> str:
    """A frequency without its unit: one decimal below 100 Hz, none above 1 kHz."""
    return f"{value_hz:.0f}" if value_hz >= 1000 else f"{value_hz:.1f}"


def span_of(low: float, high: float) -> str:
    """``22.3–23.7``: an interval of frequencies, without the unit; one number where it is one."""
    first, second = hertz(low), hertz(high)
    return first if first == second else f"{first}–{second}"


def ratio_percent(share: float) -> str:
    """A relative distance such as a separation."""
    return f"{100 * share:.0f} %"


def seconds(duration_s: float) -> str:
    """A length of time: ``21.3 s`` or ``3 min 05 s``."""
    if duration_s < 100:
        return f"{duration_s:.1f} s"
    minutes, rest = divmod(round(duration_s), 60)
    return f"{minutes} min {rest:02d} s"


def time_left(elapsed_s: float, share: float) -> str:
    """``4 s left``, at the pace so far; empty while too little is done to tell."""
    if elapsed_s < 1 or not 0.05 <= share < 1:
        return ""
    left_s = elapsed_s * (1 - share) / share
    return f"{seconds(left_s) if left_s >= 100 else f'{left_s:.0f} s'} left"


def count(number: int, word: str) -> str:
    """``1 mode``, ``3 modes``."""
    return f"{number} {word}" if number == 1 else f"{number} {word}s"


def sentence(text: str) -> str:
    """Capital at the start and a full stop at the end."""
    text = text.strip()
    if not text:
        return text
    ended = text if text[-1] in ".!?" else f"{text}."
    return ended[0].upper() + ended[1:]


def safe(text: str) -> str:
    """Text that may come from a file, with what would steer the terminal made visible."""
    return "\n".join(clean(line) for line in text.split("\n"))
