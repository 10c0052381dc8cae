"""From the command to the first paint, in fresh processes: ``python -m tests.bench.cold_start``."""

from __future__ import annotations

import numpy as np

from tests.bench.asking import parser
from tests.bench.measuring import ROOT, processes_in_turn, ratio
from tests.bench.rows import BY_CLOCK, Row, lines, table

SAMPLE = ROOT / "samples" / "glycol-booster" / "job.toml"
BARE_APP = """
from textual.app import App
async def stop(pilot): pilot.app.exit()
App().run(headless=True, size=(80, 24), auto_pilot=stop)
"""
OUR_APP = f"""
import os; os.environ["OPENBLAS_NUM_THREADS"] = "1"
from pathlib import Path
from fieldkit.ui.app import FieldkitApp
async def stop(pilot): os._exit(0)
FieldkitApp(Path({str(SAMPLE)!r})).run(headless=True, size=(80, 24), auto_pilot=stop)
"""
LIBRARIES = "import numpy, scipy.linalg, scipy.optimize, scipy.signal, pint, pydantic"
ANSWER = f"""
import sys; sys.argv = ["fieldkit", "detune", {str(SAMPLE)!r}, "--json"]
from fieldkit.__main__ import main
main()
"""


def rows(runs: int) -> list[Row]:
    """First paint beside a bare app, and file to ranked fixes beside importing its libraries."""
    paint = processes_in_turn({"ours": OUR_APP, "bare": BARE_APP}, runs)
    answer = processes_in_turn({"ours": ANSWER, "libraries": LIBRARIES}, max(2, runs // 2))
    bare, libraries = "first paint of a bare Textual app", "importing numpy, scipy, pint, pydantic"
    return [
        _row("cold start to first paint, with a job", *paint.values(), bare, 0),
        _row("cold start to first paint, with a job", *paint.values(), bare, 1),
        _row("cold start to ranked fixes on the command line", *answer.values(), libraries, 1),
    ]


def _row(name: str, ours: np.ndarray, theirs: np.ndarray, against: str, column: int) -> Row:
    unit = ("s " + BY_CLOCK, "s of processor")[column]
    a, b = ours[:, column], theirs[:, column]
    return Row(name, float(np.median(a)), float(np.median(b)), ratio(a, b), against, unit)


def main() -> None:
    """Print the table."""
    args = parser("tests.bench.cold_start", __doc__, "runs").parse_args()
    print(table(lines("cold start", rows(args.runs), busy=False)))


if __name__ == "__main__":
    main()
