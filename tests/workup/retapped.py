"""Recordings of a sample plant with something installed on it, from the samples' simulation."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from functools import cache
from pathlib import Path

from fieldkit import workup
from fieldkit.job.schema import load_job
from tests.samples import SAMPLES

import make  # isort: skip
from frame import Hold  # isort: skip
from plants import SMALL_BORE, Hit  # isort: skip
from sound import tap_signal, write_flac  # isort: skip

PLANT = SMALL_BORE
NOT_STRUCK = (Hit(5.0, 0.0, 3e-3),)
JOB = SAMPLES / PLANT.folder / "job.toml"


@cache
def work() -> workup.Workup:
    """The small-bore job as it was, worked out once for all tests."""
    return workup.run(load_job(JOB))


def brace(at_m: float, vertical_n_per_m: float, lateral_n_per_m: float) -> Hold:
    """A support of the simulation."""
    return Hold(at_m, {"vertical": vertical_n_per_m, "lateral": lateral_n_per_m})


def record(
    folder: Path, *more: Hold, seed: int = 900, hits: Sequence[Hit] | None = None
) -> list[Path]:
    """The taps of the plant with more supports on it, by other blows than the sample's."""
    plant = replace(PLANT, holds=(*PLANT.holds, *more))
    modes = make.modes_in(plant, plant.tapped)
    damping = make.damping_of(plant, plant.tapped, len(modes.frequency_hz))
    files = []
    for i, session in enumerate(plant.taps):
        again = replace(session, seed=seed + i, rate_hz=4000)
        if hits is not None:
            again = replace(again, hits=tuple(hits))
        path = folder / session.file
        signal = tap_signal(modes, damping, again)
        write_flac(path, signal, again.rate_hz, again.bits, again.full_scale)
        files.append(path)
    return files
