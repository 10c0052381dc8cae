"""The tables of the bench, as text."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from tests.bench.accuracy.scoring import Score
from tests.bench.accuracy.tally import Tally
from tests.bench.accuracy.trial import Trial

Column = tuple[str, Callable[[Tally], str]]


def ratio(value: float, digits: int = 2) -> str:
    return "–" if np.isnan(value) else f"{value:.{digits}f}"


def percent(value: float) -> str:
    return "–" if np.isnan(value) else f"{100 * value:.3g} %"


def error(value: float) -> str:
    return "–" if np.isnan(value) else f"{1e6 * value:.3g}"


def times(tally: Tally) -> str:
    """How many times larger the frequency error of peak picking is."""
    value = tally.picked_frequency_error / tally.frequency_error
    return "–" if np.isnan(value) else f"{value:.3g} ×"


def estimable(score: Score) -> int:
    return score.estimable


COLUMNS: tuple[Column, ...] = (
    ("records", lambda t: str(len(t.scores))),
    ("estimable", lambda t: str(t.sum(estimable))),
    ("found", lambda t: percent(t.share(lambda s: len(s.found), estimable))),
    ("false a record", lambda t: ratio(t.false_per_record, 3)),
    ("f error / bound", lambda t: ratio(t.frequency_trimmed)),
    ("ζ error / bound", lambda t: ratio(t.damping_trimmed)),
    ("f covered", lambda t: percent(t.frequency_coverage)),
    ("ζ covered", lambda t: percent(t.damping_coverage)),
    ("f error ppm", lambda t: error(t.frequency_error)),
    ("ζ error", lambda t: percent(t.damping_error)),
    ("peaks: found", lambda t: percent(t.share(lambda s: s.picked, estimable))),
    ("peaks: f error ppm", lambda t: error(t.picked_frequency_error)),
    ("peaks: ζ error", lambda t: percent(t.picked_damping_error)),
    ("peaks: f error larger", times),
    ("median s", lambda t: ratio(t.median_cpu_s)),
    ("worst s", lambda t: ratio(t.worst_cpu_s)),
)


def table(trials: Sequence[Trial], way: str) -> list[list[str]]:
    """Head, one row per kind, and all together."""
    kinds = list(dict.fromkeys(trial.kind for trial in trials))
    head = ["kind", *(name for name, _ in COLUMNS)]
    rows = [row(kind, [t.scores[way] for t in trials if t.kind == kind]) for kind in kinds]
    return [head, *rows, row("all", [t.scores[way] for t in trials])]


def row(name: str, scores: Sequence[Score]) -> list[str]:
    tally = Tally(tuple(scores))
    return [name, *(show(tally) for _, show in COLUMNS)]


def totals(trials: Sequence[Trial], way: str) -> list[str]:
    """What is counted over all recordings, in sentences."""
    tally = Tally(tuple(t.scores[way] for t in trials))
    empty = Tally(tuple(s for s in tally.scores if s.estimable == 0))
    blows = (
        f"doubles told {counted(tally, 'doubles_told', 'doubles')},"
        f" clipped told {counted(tally, 'clipped_told', 'clipped')},"
        f" good taps used {counted(tally, 'good_taps_used', 'good_taps')}"
    )
    crashes = tally.sum(lambda s: bool(s.crash))
    return [
        *([f"broke on {crashes}"] if crashes else []),
        *([blows] if tally.sum(lambda s: s.good_taps) else []),
        f"false modes {tally.sum(lambda s: len(s.false_hz))} in {len(trials)} records,"
        f" {tally.sum(lambda s: len(s.false_at_mains_hz))} of them at mains multiples,"
        f" {empty.sum(lambda s: len(s.false_hz))} in {len(empty.scores)} without an estimable mode",
        "error / bound from the median:"
        f" f {ratio(tally.frequency_ratio)}, ζ {ratio(tally.damping_ratio)}",
    ]


def counted(tally: Tally, part: str, whole: str) -> str:
    """``found of all``, with the share."""
    some = tally.sum(lambda s: getattr(s, part))
    every = tally.sum(lambda s: getattr(s, whole))
    return f"{some} of {every} ({percent(some / every if every else np.nan)})"


def aligned(rows: Sequence[Sequence[str]]) -> str:
    """Columns as wide as their widest cell, head over two lines where it is long."""
    head = [cell.split(" ", 1) if " " in cell else [cell, ""] for cell in rows[0]]
    lines = [[h[0] for h in head], [h[1] for h in head], *rows[1:]]
    widths = [max(len(line[i]) for line in lines) for i in range(len(head))]
    return "\n".join(
        "  ".join(
            c.rjust(w) if i else c.ljust(w)
            for i, (c, w) in enumerate(zip(line, widths, strict=True))
        )
        for line in lines
    )


def markdown(rows: Sequence[Sequence[str]]) -> str:
    """A table of a document."""
    rule = ["---", *("---:" for _ in rows[0][1:])]
    return "\n".join(f"| {' | '.join(line)} |" for line in [rows[0], rule, *rows[1:]])
