"""The simulation behind the sample jobs stands beside them, not in a package."""

import sys
from pathlib import Path

SAMPLES = Path(__file__).parents[2] / "samples"
JOBS = ("glycol-booster", "riser", "small-bore")
sys.path.insert(0, str(SAMPLES))
