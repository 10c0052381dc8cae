"""The benches, as fixtures."""

from __future__ import annotations

import pytest

from tests.capture.rig import end_portaudio, pulse_bench


@pytest.fixture
def bench(tmp_path, monkeypatch):
    """A PulseAudio server of its own; PortAudio in this process finds it."""
    with pulse_bench(tmp_path / "bench") as made:
        for name, value in made.environment.items():
            monkeypatch.setenv(name, value)
        try:
            yield made
        finally:
            made.thaw() if made.server.poll() is None else None
            end_portaudio()
