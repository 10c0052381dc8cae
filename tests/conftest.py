"""For all tests: one thread for small matrices, and no test that depends on the clock."""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

from hypothesis import settings

settings.register_profile("fresh", deadline=None)
settings.register_profile("same every time", deadline=None, derandomize=True)
settings.load_profile("same every time" if os.environ.get("CI") else "fresh")
