"""Stand-ins for terminals that cannot show braille, box drawing or symbols."""

from __future__ import annotations

import os
import sys

import numpy as np
from numpy.typing import NDArray

_ALIKE = {
    "v": "▼▽", "^": "▲△▴▵", "#": "◆█■▓", "%": "◈◐◭▨", "o": "◇○", "O": "●", "@": "◎◉", "x": "×✕✗",
    "+": "✓┬┴┼└┘┌┐╪", ".": "░·", ":": "▒┊╎", "/": "╱↗↙", "\\": "╲↖↘", "X": "╳", "-": "─╌┄╶╴−–—→←",
    "=": "━═╍", "|": "│┃┤├╿╽▏▕↑↓┠┨╞╡", ">": "▸▶", "<": "◂◀", "n": "∩⊓", "~": "≈∿…", "*": "•",
    "H": "╫", "N": "‖", "B": "▣", "2": "²", "3": "³", "u": "µμ", "'": "╵°", ",": "╷", "s": "□",
}  # fmt: skip
_PLAIN = {glyph: plain for plain, glyphs in _ALIKE.items() for glyph in glyphs}


def plain_code(code: int) -> int:
    """The ASCII code that stands for a code point; a question mark where nothing is alike."""
    return code if code < 127 else ord(_PLAIN.get(chr(code), "?"))


def plain_terminal() -> bool:
    """Whether the terminal cannot be trusted with more than ASCII.

    The Linux text console has no braille in its font; an encoding other than UTF-8 cannot carry it.
    """
    if os.environ.get("TERM") == "linux":
        return True
    encoding = getattr(sys.__stderr__, "encoding", None) or "utf-8"
    return not encoding.lower().replace("-", "").startswith("utf")


def _plain_dots(bits: int) -> str:
    """An ASCII character that leans like the dots of a braille cell."""
    left = [level for level, bit in enumerate((0x01, 0x02, 0x04, 0x40)) if bits & bit]
    right = [level for level, bit in enumerate((0x08, 0x10, 0x20, 0x80)) if bits & bit]
    if len(left) + len(right) >= 6:
        return "#"
    levels = set(left) | set(right)
    if len(levels) == 1:
        return ("'-._" if left and right else "'\"..")[levels.pop()]
    if not left or not right or abs(len(left) - len(right)) >= 2:
        return "|"
    lean = sum(right) / len(right) - sum(left) / len(left)
    return "/" if lean < 0 else "\\" if lean > 0 else "|"


PLAIN_BRAILLE: NDArray[np.uint32] = np.array(
    [ord(" ")] + [ord(_plain_dots(bits)) for bits in range(1, 256)], dtype=np.uint32
)
"""ASCII code for each braille dot pattern."""
