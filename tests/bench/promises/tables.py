"""The tables of the bench, as text."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from tests.bench.promises.tally import FIFTHS, Tally
from tests.bench.promises.trial import NOMINAL, SCALED, Trial

HEAD = (
    "family", "spans", "refused", "offered ≥ 0.9", "of those kept", "promised", "kept",
    "intervals hold", "as it is", "median error", "nominal: kept", "scaled: kept",
)  # fmt: skip
WORTH_HEAD = ("effective size", "spans", "offered ≥ 0.9", "of those kept", "intervals hold")
WORTH = ((0.0, 30.0), (30.0, 60.0), (60.0, 120.0), (120.0, np.inf))
FIFTHS_HEAD = ("promised between", "spans", "promised", "kept", "difference")


def percent(value: float) -> str:
    return "–" if np.isnan(value) else f"{100 * value:.0f} %"


def share(value: float, digits: int = 2) -> str:
    return "–" if np.isnan(value) else f"{value:.{digits}f}"


def table(trials: Sequence[Trial], way: str) -> list[list[str]]:
    """Head, one row per family, and all together."""
    own = [trial for trial in trials if trial.way == way]
    families = list(dict.fromkeys(trial.family for trial in own))
    rows = [_row(name, Tally([t for t in own if t.family == name])) for name in families]
    return [list(HEAD), *rows, _row("all", Tally(own))]


def _row(name: str, tally: Tally) -> list[str]:
    return [
        name,
        str(len(tally.trials)),
        str(tally.refused),
        percent(tally.offered_share),
        f"{percent(tally.kept_of_offered)} of {len(tally.offered)}",
        share(tally.mean_promise),
        share(tally.mean_kept),
        percent(tally.coverage),
        percent(tally.coverage_now),
        f"{100 * tally.median_error:.1f} %",
        _usual(tally, NOMINAL),
        _usual(tally, SCALED),
    ]


def _usual(tally: Tally, name: str) -> str:
    kept = tally.usual(name)
    return f"{percent(float(np.mean(kept)) if kept else np.nan)} of {len(kept)}"


def fifths(trials: Sequence[Trial], way: str) -> list[list[str]]:
    """Promised against kept, fifth by fifth of the scale."""
    tally = Tally([trial for trial in trials if trial.way == way])
    rows = []
    for low, high in FIFTHS:
        promised, kept = tally.between(low, high)
        both = (float(np.mean(promised)), float(np.mean(kept))) if len(kept) else (np.nan, np.nan)
        rows.append(
            [f"{low:g} to {high:g}", str(len(kept)), *map(share, both), share(both[0] - both[1])]
        )
    return [list(FIFTHS_HEAD), *rows]


def by_worth(trials: Sequence[Trial], way: str) -> list[list[str]]:
    """Spans by how many independent parameter sets their ensemble is worth."""
    rows = []
    for low, high in WORTH:
        tally = Tally([t for t in trials if t.way == way and low <= t.effective < high])
        rows.append(
            [
                f"{low:g} to {high:g}" if high < np.inf else f"from {low:g}",
                str(len(tally.answered)),
                percent(tally.offered_share),
                f"{percent(tally.kept_of_offered)} of {len(tally.offered)}",
                percent(tally.coverage),
            ]
        )
    return [list(WORTH_HEAD), *rows]


def totals(trials: Sequence[Trial], way: str) -> list[str]:
    """What no table shows."""
    tally = Tally([trial for trial in trials if trial.way == way])
    match_s = [t.match_s for t in tally.answered]
    detune_s = [t.detune_s for t in tally.answered]
    effective = [t.effective for t in tally.answered]
    return [
        f"promised less kept over all: {tally.mean_promise - tally.mean_kept:+.3f}",
        f"no change offered: {sum(t.promised is None for t in tally.answered)}",
        f"processor seconds, median and worst: match {np.median(match_s):.2f}, "
        f"{np.max(match_s):.2f}; changes {np.median(detune_s):.2f}, {np.max(detune_s):.2f}",
        f"effective size, median and least: {np.median(effective):.0f}, {np.min(effective):.0f}",
    ]


def aligned(rows: Iterable[Sequence[str]]) -> str:
    """Columns of equal width."""
    listed = [list(row) for row in rows]
    width = [max(len(row[i]) for row in listed) for i in range(len(listed[0]))]
    return "\n".join(
        "  ".join(cell.ljust(w) for cell, w in zip(row, width, strict=True)).rstrip()
        for row in listed
    )


def markdown(rows: Sequence[Sequence[str]]) -> str:
    """The same as a Markdown table."""
    ruled = [rows[0], ["---"] * len(rows[0]), *rows[1:]]
    return "\n".join(f"| {' | '.join(row)} |" for row in ruled)
