"""Real struck bars through ``fieldkit peaks``: ``python -m tests.bench.struck_bars FOLDER``.

Writes each glockenspiel bar, two vibraphone bars and the tubular bell of the Debian package
fluid-soundfont-gm as a WAV file between two quiet seconds, and prints what the command says of it:
taps, modes, tones, and what it refused with the reason. What theory and the bare transform say
stands above each. The bank cuts its recordings while they still ring, so each is written with an
exponential window that falls to 1 % at its end, as impact testing does with short records; that
adds the stated damping.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import soundfile

from tests.published.outside import SOUND_BANK
from tests.published.soundfont import Sample, read_samples

QUIET_S = 2.0
WINDOW_END = 0.01
QUIET_RMS = 1e-4
"""Noise before and under the blow, of full scale: a quiet room."""
AFTER_BLOW_S = 0.035
SHARE_OF_RATE = 0.4
KINDS = {
    "Glocken ": "uniform steel bar: second partial at 2.76 times the first, less up to 3.8 %",
    "Vibraphone A4": "undercut bar: second partial at 4.0",
    "Vibraphone F#5": "undercut bar: second partial at 4.0",
    "Tubular Bells C7": "uniform tube: modes 3, 4, 5 ... near 49 : 81 : 121 : 169 : 225",
}
LINES = 8


def main(folder: Path) -> None:
    """Write and read every bar."""
    folder.mkdir(parents=True, exist_ok=True)
    for start, theory in KINDS.items():
        for sample in read_samples(SOUND_BANK, start).values():
            if sample.name.endswith("(R)"):
                continue
            name = sample.name.removesuffix("(L)").replace(" ", "-").replace("#", "is")
            path = folder / f"{name}.wav"
            soundfile.write(path, between_quiet(sample), round(sample.rate_hz), "PCM_16")
            show(sample, theory, path)


def decay_time_s(sample: Sample) -> float:
    """Time constant of the window."""
    return float(len(sample.values) / sample.rate_hz / np.log(1 / WINDOW_END))


def between_quiet(sample: Sample) -> np.ndarray:
    """The bar, windowed, with a quiet room before, under and after it."""
    time_s = np.arange(len(sample.values)) / sample.rate_hz
    struck = sample.values * np.exp(-time_s / decay_time_s(sample))
    quiet = np.zeros(round(QUIET_S * sample.rate_hz))
    recorded = np.concatenate([quiet, struck, quiet])
    noise = np.random.default_rng(1).standard_normal(len(recorded))
    return np.clip(recorded + QUIET_RMS * noise, -1, 1 - 2**-15)


def show(sample: Sample, theory: str, path: Path) -> None:
    """Theory and transform, then the command and its answer."""
    lines_hz = strongest_lines_hz(sample)
    added = 100 / (2 * np.pi * decay_time_s(sample))
    highest_hz = min(1.05 * max(lines_hz), SHARE_OF_RATE * sample.rate_hz)
    command = ["peaks", str(path), "--up-to", f"{highest_hz:.0f}"]
    print(f"\n== {sample.name}: {theory}")
    print("   lines of the transform:", ", ".join(f"{hz:.1f}" for hz in lines_hz), "Hz")
    print(f"   the window adds {added:.0f} % / (f in Hz) of damping")
    print("   fieldkit", " ".join(command), flush=True)
    subprocess.run([sys.executable, "-m", "fieldkit", *command], stderr=subprocess.STDOUT)


def strongest_lines_hz(sample: Sample) -> list[float]:
    """Tops of the transform 8 % apart, within 50 dB of the strongest, in order of frequency."""
    decay = sample.values[round(AFTER_BLOW_S * sample.rate_hz) :]
    height = np.abs(np.fft.rfft(decay * np.hanning(len(decay))))
    frequency_hz = np.fft.rfftfreq(len(decay), 1 / sample.rate_hz)
    height[(frequency_hz < 100) | (frequency_hz > SHARE_OF_RATE * sample.rate_hz)] = 0.0
    height[height < 3e-3 * height.max()] = 0.0
    found: list[float] = []
    while len(found) < LINES and height.any():
        top = frequency_hz[np.argmax(height)]
        found.append(float(top))
        height[abs(frequency_hz / top - 1) < 0.08] = 0.0
    return sorted(found)


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit("usage: python -m tests.bench.struck_bars FOLDER")
    if not SOUND_BANK.is_file():
        sys.exit(f"{SOUND_BANK} is absent: apt-get install fluid-soundfont-gm")
    main(Path(sys.argv[1]))
