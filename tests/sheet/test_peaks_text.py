"""What ``fieldkit peaks`` prints: each tap with its reasons, modes, and what was not accepted."""

from __future__ import annotations

from pathlib import Path

from fieldkit.detune.evidence import Evidence
from fieldkit.job.document import RecordingEntry
from fieldkit.sheet import tables
from fieldkit.signal.modes import MeasuredMode, RefusedMode, Tone
from fieldkit.signal.taps import Tap, TapSearch
from fieldkit.workup import TapReading

TWICE = "struck twice: a second blow 56 ms after the first; let the hammer rebound freely"


def reading(*taps: Tap) -> TapReading:
    search = TapSearch(taps, (0, 100), 1e-3)
    entry = RecordingEntry(Path("tap.wav"), "tap", "tapped", 1)
    return TapReading("tap.wav", 4000.0, 1, 20.0, search, (), None, entry)


def test_reasons_hang_beside_the_time_of_their_tap():
    good = Tap(2.2, 0, 10, 0.5, True)
    double = Tap(5.737, 20, 30, 0.5, False, (TWICE,))
    lines = tables.peaks([reading(good, double)], Evidence(()))
    assert lines[:4] == [
        "tap.wav: 20.0 s at 4000 Hz, 2 taps, 1 usable",
        "   1  at   2.200 s  usable",
        "   2  at   5.737 s  struck twice: a second blow 56 ms after the first; let the",
        "                    hammer rebound freely",
    ]


def test_one_tap_is_told_as_one():
    lines = tables.peaks([reading(Tap(2.2, 0, 10, 0.5, True))], Evidence(()))
    assert lines[0].endswith("1 tap, 1 usable")


def test_what_was_refused_stands_with_its_reason():
    evidence = Evidence(
        modes=(MeasuredMode(23.4, 0.01, 0.011, 0.001, taps=3, strength=0.002),),
        tones=(Tone(50.0, 0.1),),
        refused=(RefusedMode(31.5, "damping uncertain by 34 %: too little energy"),),
    )
    text = "\n".join(tables.peaks([reading()], evidence))
    assert "<0.01" in text
    assert "Steady tones, not modes: 50.00 Hz" in text
    assert "  - 31.50 Hz: damping uncertain by 34 %: too little energy" in text
