"""Taps of the booster line as it would ring after its clamp was made stiffer, to try a recheck on.

They come from the simulation of the samples, with other blows than the sample's own.

Usage: python docs/make_retap.py FOLDER [STIFFNESS in MN/m, 14 if left out]
"""

from __future__ import annotations

import os
import sys
from dataclasses import replace
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
SAMPLES = Path(__file__).resolve().parent.parent / "samples"
sys.path.insert(0, str(SAMPLES))

from frame import Hold  # noqa: E402
from make import damping_of, modes_in  # noqa: E402
from plants import GLYCOL_BOOSTER, Plant  # noqa: E402
from sound import tap_signal, write_flac  # noqa: E402

CLAMP = 1
"""Which of the supports of the true pipe is the clamp in the middle."""
DRAWN_MN_PER_M = 14.0
"""What the first of the ranked changes asks for."""
NEW_SEED = 4100


def stiffened(plant: Plant, stiffness_n_per_m: float) -> Plant:
    """The pipe with its clamp held as firmly in both directions across it."""
    held = list(plant.holds)
    springs = {**held[CLAMP].springs, "vertical": stiffness_n_per_m, "lateral": stiffness_n_per_m}
    held[CLAMP] = Hold(held[CLAMP].at_m, springs)
    return replace(plant, holds=tuple(held))


def main(folder: Path, stiffness_mn_per_m: float = DRAWN_MN_PER_M) -> None:
    """One recording for each tap session of the sample."""
    folder.mkdir(parents=True, exist_ok=True)
    plant = stiffened(GLYCOL_BOOSTER, 1e6 * stiffness_mn_per_m)
    modes = modes_in(plant, plant.tapped)
    damping = damping_of(plant, plant.tapped, len(modes.frequency_hz))
    for number, session in enumerate(plant.taps):
        again = replace(session, seed=NEW_SEED + number)
        path = folder / session.file
        signal = tap_signal(modes, damping, again)
        write_flac(path, signal, again.rate_hz, again.bits, again.full_scale)
        print(path)


if __name__ == "__main__":
    if len(sys.argv) < 2:
        raise SystemExit(__doc__)
    main(Path(sys.argv[1]), *map(float, sys.argv[2:3]))
