"""For all tests: one thread for small matrices, no clock, and nothing of the user's own touched."""

from __future__ import annotations

import os
from collections.abc import Iterator

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("OMP_NUM_THREADS", "1")

import pytest
from hypothesis import settings

settings.register_profile("fresh", deadline=None)
settings.register_profile("same every time", deadline=None, derandomize=True)
settings.load_profile("same every time" if os.environ.get("CI") else "fresh")


@pytest.fixture(scope="session", autouse=True)
def own_folders(tmp_path_factory: pytest.TempPathFactory) -> Iterator[None]:
    """Recent jobs, unsaved work and presets of what tests start go to a folder of theirs."""
    with pytest.MonkeyPatch.context() as patch:
        for name in ("XDG_STATE_HOME", "XDG_CONFIG_HOME", "XDG_DATA_HOME"):
            patch.setenv(name, str(tmp_path_factory.mktemp("home") / name.lower()))
        yield
