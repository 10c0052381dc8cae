"""A callback that is kept waiting loses frames, and every loss is flagged (JACK, dummy driver)."""

from __future__ import annotations

import json
import os
import subprocess
import sys

from tests.capture.rig import GENEROUS_S, RATE_HZ, jack_bench, until

STALL_S = 0.3
LISTENER = """
import json, sys, threading, time
from fieldkit.capture.devices import find_input, list_inputs
from fieldkit.capture.portaudio import PortAudioSource

blocks, done = [], threading.Event()

def deliver(block):
    blocks.append(block)
    if len(blocks) in (200, 400, 600):
        time.sleep(float(sys.argv[1]))
    if len(blocks) == 800:
        done.set()

inputs = list_inputs(check_rates=False)
source = PortAudioSource(
    find_input("rig", inputs), rate_hz=48000, channels=2, latency_s="low"
)
source.start(deliver, lambda end: print(end, file=sys.stderr))
assert done.wait(60)
source.stop()
first_lost = [
    (i, block.first_frame, block.lost_frames, block.cause)
    for i, block in enumerate(blocks) if block.lost_frames != 0
]
print(json.dumps(first_lost))
"""
ALSA = """
pcm.rig {
    type jack
    playback_ports { 0 system:playback_1 1 system:playback_2 }
    capture_ports { 0 system:capture_1 1 system:capture_2 }
}
pcm.default "rig"
"""


def test_every_overflow_is_flagged_with_about_what_was_lost(tmp_path):
    (tmp_path / "asound.conf").write_text(ALSA)
    with jack_bench() as environment:
        ran = until(lambda: listened(environment | {"ALSA_CONFIG_PATH": f"{tmp_path}/asound.conf"}))
    lost = json.loads(ran)
    by_block = {index: (frames, cause) for index, _, frames, cause in lost}
    for stalled in (200, 400, 600):
        frames, cause = by_block[stalled]
        assert cause == "the input overflowed"
        assert 0.5 * STALL_S * RATE_HZ < frames < 1.5 * STALL_S * RATE_HZ


def listened(environment):
    """What the listener printed; None while the server is not up yet."""
    ran = subprocess.run(
        [sys.executable, "-c", LISTENER, str(STALL_S)],
        env=os.environ | environment,
        capture_output=True,
        text=True,
        timeout=2 * GENEROUS_S,
        check=False,
    )
    return ran.stdout if ran.returncode == 0 else None
