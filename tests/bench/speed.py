"""How fast the answers come, as counts and ratios: ``python tests/bench/speed.py``.

Whole processes are timed from outside, the median of a few runs after a warm-up; a figure that
depends on the machine stands beside the same for something everybody has.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
SAMPLE = ROOT / "samples" / "glycol-booster" / "job.toml"
RUNS = 5

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
IMPORTS = "import numpy, scipy.linalg, scipy.optimize, scipy.signal, pint, pydantic"


def main() -> None:
    """Print the table."""
    bare, ours = seconds(BARE_APP), seconds(OUR_APP)
    print(f"first paint            {ours:6.2f} s   {ours / bare:4.1f} x a bare Textual app")
    libraries = seconds(IMPORTS)
    answer = seconds("from fieldkit.__main__ import main; main()", "detune", str(SAMPLE), "--json")
    ratio = answer / libraries
    print(f"file to ranked fixes   {answer:6.2f} s   {ratio:4.1f} x importing its libraries")
    started = answered_in_process()
    print(f"  the program running  {started:6.2f} s   {started / libraries:4.1f} x the same")
    for line in evaluations():
        print(line)


def seconds(code: str, *words: str) -> float:
    """Median wall time of a fresh process."""
    times = []
    for _ in range(RUNS + 1):
        start = time.perf_counter()
        subprocess.run(
            [sys.executable, "-c", code, *words], check=True, stdout=subprocess.DEVNULL, cwd=ROOT
        )
        times.append(time.perf_counter() - start)
    return statistics.median(times[1:])


def answered_in_process() -> float:
    """Seconds from the job file to ranked fixes where the libraries are loaded."""
    from fieldkit import workup
    from fieldkit.job.schema import load_job

    return timed(lambda: workup.run(load_job(SAMPLE)))[1]


def evaluations() -> list[str]:
    """Fixes times members judged in a second: counted, solved, and re-solved from scratch."""
    import numpy as np

    from fieldkit.detune import judge
    from fieldkit.detune.candidates import Search, generate
    from fieldkit.detune.excitation import bands
    from fieldkit.detune.field import field
    from fieldkit.detune.reduced import build
    from fieldkit.detune.screen import as_installed
    from fieldkit.detune.unknowns import unknowns_of
    from fieldkit.job.schema import load_job
    from fieldkit.progress import Progress

    job = load_job(SAMPLE)
    unknowns = unknowns_of(job.span, (job.tapped, job.running))
    model = build(job.span, job.running, unknowns, job.goal.up_to_hz)
    rng = np.random.default_rng(1)
    z = 0.5 * rng.standard_normal((200, len(unknowns)))
    base = field(job.span, model, z)
    forbidden = bands(job.excitations, job.goal.margin)
    search = Search(job.span, base, forbidden, job.goal, as_installed(200, rng))
    candidates, counted = timed(lambda: generate(search, Progress()))
    some = candidates[:: max(1, len(candidates) // 20)]
    _, solved = timed(
        lambda: [judge.after(base, search.push(c.change), job.goal.up_to_hz) for c in some]
    )
    _, fully = timed(
        lambda: [
            judge.resolve(base, job.span, job.running, c.change, job.goal.up_to_hz) for c in some
        ]
    )
    per_full = len(some) / fully
    per_count = len(candidates) * 200 / counted
    per_solve = len(some) * 200 / solved
    return [
        f"clear or not, counted  {per_count:8.0f} fix evaluations a second "
        f"({len(candidates)} fixes x 200 members), {per_count / per_full:.0f} x a model built anew",
        f"frequencies, solved    {per_solve:8.0f} fix evaluations a second, "
        f"{per_solve / per_full:.0f} x a model built anew",
    ]


def timed(work):  # type: ignore[no-untyped-def]
    """(result, seconds), the second of two runs."""
    work()
    start = time.perf_counter()
    result = work()
    return result, time.perf_counter() - start


if __name__ == "__main__":
    main()
