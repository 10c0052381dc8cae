"""A whole workup of each sample, and its parts: ``python -m tests.bench.workups``.

Beside it what is usual with a general-purpose library: peaks of the averaged spectra of the taps,
then a straight line of the same length, supports and masses solved anew for every change of a
coarse hand-made search. That knows no uncertainty, no bends and no states.
"""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import time
from collections.abc import Iterator

import numpy as np

from fieldkit import workup
from fieldkit.detune.unknowns import member_span, unknowns_of
from fieldkit.job.document import Job
from fieldkit.job.schema import load_job
from fieldkit.progress import Progress
from tests.bench.accuracy.peak_picking import pick
from tests.bench.asking import parser
from tests.bench.measuring import ROOT, in_turn, ratio
from tests.bench.rows import Row, lines, table
from tests.bench.screening import held
from tests.reference.dynamic_stiffness import Attachment, Beam
from tests.reference.hermite_beam import natural_frequencies_hz

SAMPLES = ("glycol-booster", "riser", "small-bore")
PLACES, STIFFNESSES = 60, (1e5, 1e6, 1e7)
LOW_HZ, PEAKS, MODES, ELEMENTS = 2.0, 6, 12, 60
USUAL = (
    "peaks of averaged spectra, and a straight line solved by scikit-fem "
    f"for {PLACES} places x {len(STIFFNESSES)} stiffnesses"
)
UNIT = "s of processor"


def rows(runs: int) -> list[Row]:
    """One for each sample and each of its steps."""
    return [row for name in SAMPLES for row in of_sample(name, runs)]


def of_sample(name: str, runs: int) -> Iterator[Row]:
    """The whole, then each step beside the whole."""
    job = load_job(ROOT / "samples" / name / "job.toml")
    readings = workup.tap_readings(job.recordings_of("tap"), Progress())
    steps: list[dict[str, float]] = []
    works = {"ours": lambda: steps.append(steps_s(job)), "usual": lambda: usual(job, readings)}
    spent_s = in_turn(works, runs)
    ours, theirs = spent_s["ours"], spent_s["usual"]
    whole = float(np.median(ours))
    yield Row(
        f"workup of {name}", whole, float(np.median(theirs)), ratio(ours, theirs), USUAL, UNIT
    )
    for step in steps[0]:
        each = np.array([run[step] for run in steps[1:]])
        share = ratio(each, ours)
        yield Row(
            f"workup of {name}: {step}", float(np.median(each)), whole, share, "its whole", UNIT
        )


def steps_s(job: Job) -> dict[str, float]:
    """Processor seconds of each step of one workup."""
    spent: dict[str, float] = {}
    last = time.process_time()

    def after(work: workup.Workup) -> None:
        nonlocal last
        now = time.process_time()
        spent[work.done[-1]], last = now - last, now

    workup.run(job, on_part=after)
    return spent


def usual(job: Job, readings: tuple[workup.TapReading, ...]) -> None:
    """Peaks of every tap recording, its blows known; then one solve for every change."""
    for reading in readings:
        if reading.records:
            decays = [record.samples for record in reading.records]
            pick(decays, reading.records[0].rate_hz, LOW_HZ, job.goal.up_to_hz, PEAKS)
    for at_m in np.linspace(0.0, job.span.length_m, PLACES):
        for stiffness in STIFFNESSES:
            straight_hz(job, Attachment(float(at_m), stiffness))


def straight_hz(job: Job, *more: Attachment, elements: int = ELEMENTS) -> np.ndarray:
    """The span as one straight line, unknowns at their medians, with more attached."""
    unknowns = unknowns_of(job.span, (job.tapped, job.running))
    span = member_span(job.span, unknowns, np.zeros(len(unknowns)))
    pipe = span.pipe
    modulus = span.material.modulus_at(job.running.temperature_k)
    density = span.material.density_kg_per_m3
    beam = Beam(modulus * pipe.second_moment_m4, pipe.wall_area_m2 * density)
    supports = [Attachment(at, k, turning) for at, k, turning in held(span)]
    masses = [Attachment(mass.at_m, mass_kg=mass.mass_kg) for mass in span.masses]
    attached = [*supports, *masses, *more]
    return natural_frequencies_hz(beam, span.length_m, attached, MODES, elements)


def main() -> None:
    """Print the table."""
    args = parser("tests.bench.workups", __doc__, "runs").parse_args()
    print(table(lines("workups", rows(args.runs), busy=False)))


if __name__ == "__main__":
    main()
