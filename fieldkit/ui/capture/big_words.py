"""Words in letters three rows high, to be read at arm's length."""

from __future__ import annotations

_LETTERS = {
    "A": ".#. #.# ### #.# #.#", "B": "##. #.# ##. #.# ##.", "C": ".## #.. #.. #.. .##",
    "D": "##. #.# #.# #.# ##.", "E": "### #.. ##. #.. ###", "F": "### #.. ##. #.. #..",
    "G": ".## #.. #.# #.# .##", "H": "#.# #.# ### #.# #.#", "I": "# # # # #",
    "J": "..# ..# ..# #.# .#.", "K": "#.# #.# ##. #.# #.#", "L": "#.. #.. #.. #.. ###",
    "M": "#...# ##.## #.#.# #...# #...#", "N": "#..# ##.# #.## #..# #..#",
    "O": ".#. #.# #.# #.# .#.", "P": "##. #.# ##. #.. #..", "Q": ".##. #..# #..# #.## .###",
    "R": "##. #.# ##. #.# #.#", "S": ".## #.. .#. ..# ##.", "T": "### .#. .#. .#. .#.",
    "U": "#.# #.# #.# #.# ###", "V": "#.# #.# #.# #.# .#.", "W": "#...# #...# #.#.# ##.## #...#",
    "X": "#.# #.# .#. #.# #.#", "Y": "#.# #.# .#. .#. .#.", "Z": "### ..# .#. #.. ###",
    " ": ".. .. .. .. ..",
}  # fmt: skip
_HALVES = {"..": " ", "#.": "▀", ".#": "▄", "##": "█"}
ROWS = 3


def big(words: str, *, plain: bool = False) -> list[str]:
    """Three lines; ``plain`` where the terminal has no blocks: spaced capitals."""
    words = words.upper()
    if plain:
        return ["", " ".join(words), ""]
    glyphs = [_LETTERS.get(letter, _LETTERS[" "]).split() for letter in words]
    pixels = [".".join(glyph[row] for glyph in glyphs) for row in range(5)]
    pixels.append("." * len(pixels[0]))
    return [
        "".join(
            _HALVES[above + below] for above, below in zip(*pixels[2 * r : 2 * r + 2], strict=True)
        )
        for r in range(ROWS)
    ]
