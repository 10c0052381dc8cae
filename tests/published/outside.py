"""Recordings that other projects publish, where they are installed.

``FIELDKIT_REQUIRE_OUTSIDE=1`` turns their absence from a reason to skip into a failure.
"""

from __future__ import annotations

import importlib.util
import os
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

SOUND_BANK = Path("/usr/share/sounds/sf2/FluidR3_GM.sf2")


def sound_bank() -> Path:
    """FluidR3 General MIDI bank, MIT licence, of the Debian package fluid-soundfont-gm."""
    if not SOUND_BANK.is_file():
        _absent(f"{SOUND_BANK} is absent: apt-get install fluid-soundfont-gm")
    return SOUND_BANK


def seismic_file(*parts: str) -> Path:
    """A file among the test data that the obspy package carries, LGPL licence; not imported."""
    found = importlib.util.find_spec("obspy")
    if found is None or found.origin is None:
        _absent("obspy is absent: pip install 'fieldkit[outside]'")
    path = Path(found.origin).parent.joinpath(*parts)
    if not path.is_file():
        _absent(f"this obspy carries no {'/'.join(parts)}")
    return path


def seismic_traces(*parts: str) -> list[tuple[NDArray[np.float64], float]]:
    """Samples and rate of each trace of such a file, read by obspy."""
    import warnings

    path = seismic_file(*parts)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import obspy

        stream = obspy.read(str(path))
    return [(np.asarray(t.data, float), float(t.stats.sampling_rate)) for t in stream]


def _absent(reason: str) -> None:
    if os.environ.get("FIELDKIT_REQUIRE_OUTSIDE") == "1":
        pytest.fail(reason)
    pytest.skip(reason)
