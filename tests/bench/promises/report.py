"""The page on promises: what was simulated, how it is counted, the tables."""

from __future__ import annotations

from collections.abc import Sequence

from tests.bench.promises import aims, tables
from tests.bench.promises.families import FAMILIES
from tests.bench.promises.trial import Trial

READING = "\n## Reading\n\n"
_HEAD = """# Are the promised chances kept?

`python -m tests.bench.promises --seed {seed} --spans {spans} --write docs/promises.md --plot
docs/promises.svg` writes this page; another seed makes other spans. Each span is invented, its
hidden truth simulated by a second solver (dynamic stiffness, exact), tapped on paper, answered as
any job would be, and the first change is then built into the hidden truth.

- **Hidden truth**: stiffness of each support, masses, fill, wall, modulus, and the length of each
  stretch on its own, drawn from the doubts; each mode is another 0.8 % off, as no pipe is a beam.
  *Unlike the priors*: every stiffness comes from a distribution whose median is moved by up to
  four times either way, and whose spread is 0.5 to 1.3 times the usual.
- **Taps**: vertical and lateral at one place or two. A mode shows with a chance of 0.15 to 0.95 by
  how it moves there; 6 % of the peaks are false, 6 % of the modes of the other plane cross over,
  two within 1.2 % merge; the frequencies have noise.
- **Machine**: on one of the three lowest running modes, over 2 % of speed, over 8 %, or with its
  second order; margin 20 %.
- **Kept**: every mode up to the limit lies outside every band after the change was built as fitters
  build: 0.35 in log stiffness, 15 mm in place.
- **Offered**: share of all spans whose first change has a chance of 0.9 or more.
- **Promised, kept**: mean over all first changes, whatever their chance.
- **Intervals hold**: share of the stated 90 % intervals that hold the true frequency of the first
  two modes after the change; *as it is*: before it. *Median error*: of those after the change.
- **Effective size**: how many independent parameter sets the ensemble of a span is worth; spans
  that were not answered are left out.
- **Reached**: *undecided* where chance alone may explain a miss. Both intervals of a span meet the
  same bracket, built once, and miss together: their own interval is wider than stated.
- **Nominal, scaled**: the usual ways. The smallest of the same changes that clears one model with
  stiff supports; the same with its frequencies multiplied by measured over computed of the lowest.
"""


def reading_in(page: str) -> str:
    """What someone wrote about the figures, which the next page keeps."""
    _, found, rest = page.partition(READING)
    return rest.partition("\n## ")[0] if found else ""


def report(trials: Sequence[Trial], seed: int, spans: int, reading: str) -> str:
    """The document, Markdown."""
    parts = [_HEAD.format(seed=seed, spans=spans) + READING + reading]
    parts += ["## The families\n", families()]
    for way in dict.fromkeys(trial.way for trial in trials):
        parts += [f"\n## Truth {way}\n", tables.markdown(tables.table(trials, way))]
        parts += ["", tables.markdown(tables.fifths(trials, way))]
        parts += ["", tables.markdown(tables.by_worth(trials, way))]
        parts += ["", tables.markdown(aims.table(trials, way))]
        parts += ["", *(f"- {line}" for line in tables.totals(trials, way))]
    parts.append(
        "\n## Promised against kept\n\n![Promised chance against share kept](promises.svg)"
    )
    return "\n".join([*parts, ""])


def families() -> str:
    """What each family is."""
    rows = [["family", "what it is"], *([name, str(f.__doc__)] for name, f in FAMILIES.items())]
    return tables.markdown(rows)
