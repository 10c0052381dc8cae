"""Random spans against exact dynamic stiffness: ``python -m tests.bench.exact_spans --spans 200``.

Straight lines of six pipe sizes on two to five supports of any stiffness, with none to three masses
and any fill; the exact answer is the root of a determinant, counted by Wittrick and Williams 1971,
Q. J. Mech. Appl. Math. 24, 263 (``tests/reference/dynamic_stiffness.py``).
"""

from __future__ import annotations

import random
import sys
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from tests.bench.asking import parser
from tests.reference.random_lines import MODES, random_line, relative_errors

ALLOWED = 1e-3


@dataclass(frozen=True)
class Figures:
    """Relative errors of the model over all spans."""

    seed: int
    error: np.ndarray
    """(spans, MODES), signed."""

    @property
    def outside(self) -> int:
        """Spans with a mode farther off than allowed."""
        return int(np.sum(np.any(np.abs(self.error) > ALLOWED, axis=1)))


def measured(seed: int, spans: int) -> Figures:
    """Draw and solve that many spans both ways."""
    rng = random.Random(seed)
    return Figures(seed, np.array([relative_errors(*random_line(rng)) for _ in range(spans)]))


def line(figures: Figures) -> str:
    """What was found, in one line."""
    size = np.abs(figures.error)
    by_mode = ", ".join(f"{100 * worst:.3f}" for worst in size.max(axis=0))
    return (
        f"{len(size)} random spans (seed {figures.seed}), {MODES} modes each: largest difference "
        f"from exact dynamic stiffness by mode {by_mode} %, median {100 * np.median(size):.4f} %, "
        f"{figures.outside} spans beyond {100 * ALLOWED:g} %"
    )


def section(figures: Figures) -> str:
    """The same for a page of documents."""
    text = " ".join((__doc__ or "").partition("\n\n")[2].split())
    return (
        "\n## Random spans against exact dynamic stiffness\n\n"
        f"`python -m tests.bench.exact_spans --seed {figures.seed} --spans {len(figures.error)}`\n"
        f"\n{text.replace('``', '`')}\n\n{line(figures)}.\n"
    )


def main(words: Sequence[str] | None = None) -> None:
    """Print the line; exit status 1 where a span is beyond what is allowed."""
    asked = parser("tests.bench.exact_spans", __doc__, "seed")
    asked.add_argument("--spans", type=int, default=200)
    options = asked.parse_args(words)
    figures = measured(options.seed, options.spans)
    sys.stdout.write(line(figures) + "\n")
    sys.exit(int(figures.outside > 0))


if __name__ == "__main__":
    main()
