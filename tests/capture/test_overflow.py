"""A callback that is kept waiting loses frames, and every loss is flagged (JACK, dummy driver)."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from contextlib import suppress

import pytest

from tests.capture.rig import GENEROUS_S, RATE_HZ, jack_bench, until

STALL_S = 0.3
STALLED = (200, 400, 600)
LISTENER = """
import json, sys, threading, time
from fieldkit.capture.clock import now_s
from fieldkit.capture.devices import find_input, list_inputs
from fieldkit.capture.portaudio import PortAudioSource

blocks, at_s, done = [], [], threading.Event()

def deliver(block):
    at_s.append(now_s())
    blocks.append(block)
    if len(blocks) in (200, 400, 600):
        time.sleep(float(sys.argv[1]))
    if len(blocks) == 800:
        done.set()

inputs = list_inputs(check_rates=False)
source = PortAudioSource(
    find_input("rig", inputs), rate_hz=48000, channels=2, latency_s="low"
)
ends = []
source.start(deliver, lambda end: (ends.append(end), done.set()))
assert done.wait(40) and not ends, ends
source.stop()
print(json.dumps([
    (at, len(block.samples), block.lost_frames, block.cause) for at, block in zip(at_s, blocks)
]))
"""
ALSA = """
pcm.rig {
    type jack
    playback_ports { 0 system:playback_1 1 system:playback_2 }
    capture_ports { 0 system:capture_1 1 system:capture_2 }
}
pcm.default "rig"
"""


@pytest.mark.timeout(900)
def test_every_overflow_is_flagged_and_nothing_is_lost_untold(tmp_path):
    """How much an overflow cost is not known where the computer was so busy that another one came
    just before; then only the flag is asked for, and all is done again."""
    (tmp_path / "asound.conf").write_text(ALSA)
    known = False
    while not known:
        blocks = json.loads(until(lambda: listened(tmp_path), 5 * GENEROUS_S, why="JACK delivers"))
        stalls = [blocks[stalled] for stalled in STALLED]
        assert {cause for _, _, _, cause in stalls} == {"the input overflowed"}
        known = all(lost is not None for _, _, lost, _ in blocks)
    assert min(lost for _, _, lost, _ in stalls) > 0.5 * STALL_S * RATE_HZ
    before, after = lag_s(blocks, 50, STALLED[0]), lag_s(blocks, STALLED[-1], len(blocks))
    assert after - before < 0.1
    assert after - before > -0.1 * len(STALLED)  # the flagged block may itself come late


def lag_s(blocks, first, end):
    """The least that the frames, those told as lost among them, are behind the clock."""
    began_s, accounted, lags_s = blocks[0][0], 0, []
    for at_s, frames, lost, _ in blocks:
        accounted += frames + (lost or 0)
        lags_s.append(at_s - began_s - accounted / RATE_HZ)
    return min(lags_s[first:end])


def listened(folder):
    """What the listener printed; None where the server was not ready, or dropped it."""
    with jack_bench() as environment, suppress(subprocess.TimeoutExpired):
        ran = subprocess.run(
            [sys.executable, "-c", LISTENER, str(STALL_S)],
            env=os.environ | environment | {"ALSA_CONFIG_PATH": f"{folder}/asound.conf"},
            capture_output=True,
            text=True,
            timeout=GENEROUS_S,
            check=False,
        )
        (folder / "listener.txt").write_text(ran.stderr)
        return ran.stdout if ran.returncode == 0 else None
    return None
