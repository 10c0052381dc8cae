"""What the promises are meant to be, beside what came out."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from tests.bench.promises.calibration_plot import interval
from tests.bench.promises.tables import percent, share
from tests.bench.promises.tally import FIFTHS, WANTED, Tally
from tests.bench.promises.trial import Trial
from tests.bench.promises.truth import LIKE

OFFERED, OFFERED_SINGLE = 0.85, 0.70
KEPT = {True: 0.95, False: 0.88}
"""Of the changes promised with 0.9 or more, by whether the hidden truth is like the priors."""
OVER_ALL, PER_FIFTH = 0.05, 0.12
COVERED = (0.88, 0.92)
HEAD = ("aim", "wanted", "found", "90 % interval", "reached")


def table(trials: Sequence[Trial], way: str) -> list[list[str]]:
    """One row for every aim; the 90 % interval tells how far chance alone may move what was found.

    An aim that is missed by less than that is undecided: more spans would tell.
    """
    own = [trial for trial in trials if trial.way == way]
    tally = Tally(own)
    held = [covered for trial in own for covered in trial.covered]
    first = [t for t in own if t.promised is not None and t.promised >= WANTED]
    offered = [t in first for t in own]
    single = [t in first and t.kind != "pair" for t in own]
    return [
        list(HEAD),
        _at_least("a change with 0.9 or more, alone or two together", OFFERED, offered),
        _at_least("the same, one change alone", OFFERED_SINGLE, single),
        _at_least("kept of those promised 0.9 or more", KEPT[way == LIKE], tally.offered),
        _within("promised less kept, over all", OVER_ALL, tally.first),
        *(
            _within(
                f"the same, promised {low:g} to {high:g}",
                PER_FIFTH,
                [(p, k) for p, k in tally.first if low <= p < high],
            )
            for low, high in FIFTHS
        ),
        _between("90 % intervals that hold the truth", COVERED, held),
    ]


def _at_least(aim: str, wanted: float, outcome: Sequence[bool]) -> list[str]:
    found, low, high = _interval(outcome)
    verdict = _verdict(found >= wanted, high >= wanted)
    return [aim, f"≥ {percent(wanted)}", percent(found), _range(low, high), verdict]


def _between(aim: str, wanted: tuple[float, float], outcome: Sequence[bool]) -> list[str]:
    found, low, high = _interval(outcome)
    inside = wanted[0] <= found <= wanted[1]
    verdict = _verdict(inside, low <= wanted[1] and high >= wanted[0])
    return [aim, " to ".join(map(percent, wanted)), percent(found), _range(low, high), verdict]


def _within(aim: str, wanted: float, promised: Sequence[tuple[float, bool]]) -> list[str]:
    if not promised:
        return [aim, f"± {wanted:g}", "–", "–", "no such promise"]
    mean = float(np.mean([p for p, _ in promised]))
    kept, low, high = _interval([k for _, k in promised])
    difference, least, most = mean - kept, mean - high, mean - low
    verdict = _verdict(abs(difference) <= wanted, least <= wanted and most >= -wanted)
    found = f"{difference:+.3f} of {len(promised)}"
    return [aim, f"± {wanted:g}", found, f"{share(least)} to {share(most)}", verdict]


def _interval(outcome: Sequence[bool]) -> tuple[float, float, float]:
    return interval(outcome) if outcome else (np.nan, np.nan, np.nan)


def _range(low: float, high: float) -> str:
    return f"{percent(low)} to {percent(high)}"


def _verdict(reached: bool, possible: bool) -> str:
    if reached:
        return "yes"
    return "undecided" if possible else "no"
