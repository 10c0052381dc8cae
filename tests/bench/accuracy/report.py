"""The accuracy document: what was simulated, how it is counted, the tables."""

from __future__ import annotations

from collections.abc import Sequence

from tests.bench.accuracy import tables
from tests.bench.accuracy.kinds import KINDS
from tests.bench.accuracy.trial import WAYS, Trial

_COMPARED = (
    "kind", "estimable", "found", "f error ppm", "ζ error",
    "peaks: found", "peaks: f error ppm", "peaks: ζ error", "peaks: f error larger",
)  # fmt: skip
_AGAINST_BOUND = (
    "kind", "records", "estimable", "found", "false a record", "f error / bound",
    "ζ error / bound", "f covered", "ζ covered", "median s", "worst s",
)  # fmt: skip

_HEAD = """# How near the measured modes come to what the data allow

`python -m tests.bench.accuracy --write docs/accuracy.md --plot docs/coverage.svg` writes this page;
here with `--seed {seed} --records {records}`, and another seed makes other recordings. Every
recording is simulated, so that its modes are known: {kinds} kinds, rates from 1 to 48 kHz, modes
from 3 to 400 Hz, uneven taps.

- **Estimable**: energy of the decays, all usable taps together, at least 25 dB over the noise (sum
  of squares over noise variance at the mode's frequency; of one clear mode of energy E damping can
  be known to within 2 / √E, relative), and at least ten standard deviations of the bound away from
  the next mode.
- **Bound**: Cramér-Rao, from the Fisher information of all modes, usable taps and steady tones of
  the recording together. Nothing unbiased can do better. Where poles differ from tap to tap, that
  scatter is part of it. Coloured noise counts with its density at the mode, which is within a few
  per cent of weighing every bin of the spectrum.
- **Error / bound**: rms of error / bound without the largest twentieth, over what that is for
  normal errors at the bound; below each table the same from the median of |error| / bound.
- **Covered**: share of the stated 95 % intervals that hold the truth; log-normal for damping.
- **False**: a stated mode that is none of the recording's.
- **Peaks**: the usual way on the same records, its taps known: averaged spectrum, zero-padded
  fourfold, highest local peaks (three for each true mode), a parabola through three bins,
  half-power bandwidth. It has found a mode when a peak lies within half a bandwidth; errors are
  medians over the modes that both found. ppm: millionths of the frequency.
- **s**: processor seconds for a recording, from samples to modes, one core.
"""


def report(trials: Sequence[Trial], seed: int) -> str:
    """The document, Markdown."""
    head = _HEAD.format(seed=seed, records=len(trials), kinds=len({t.kind for t in trials}))
    parts = [head, "## The kinds\n", kinds(trials)]
    for way in WAYS:
        rows = tables.table(trials, way)
        parts += [f"\n## {way.capitalize()}\n", tables.markdown(chosen(rows, _AGAINST_BOUND))]
        parts += ["\nBeside peak picking:\n", tables.markdown(chosen(rows, _COMPARED))]
        parts += ["", *(f"- {line}" for line in tables.totals(trials, way))]
    picture = "![Stated probability against actual share, frequency and damping](coverage.svg)"
    return "\n".join([*parts, f"\n## Stated against actual\n\n{picture}\n"])


def kinds(trials: Sequence[Trial]) -> str:
    """What each kind is."""
    names = dict.fromkeys(trial.kind for trial in trials)
    rows = [["kind", "what it is"], *([name, str(KINDS[name].__doc__)] for name in names)]
    return "\n".join(f"| {' | '.join(row)} |" for row in [rows[0], ["---", "---"], *rows[1:]])


def chosen(rows: Sequence[Sequence[str]], names: Sequence[str]) -> list[list[str]]:
    """Some columns."""
    places = [list(rows[0]).index(name) for name in names]
    return [[row[i] for i in places] for row in rows]
