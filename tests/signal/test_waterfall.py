"""The waterfall: a line that moves is seen to move, in true height and flat memory."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from fieldkit.detune.excitation import Excitation, bands
from fieldkit.errors import InputError, Refusal
from fieldkit.sheet.waterfall import at_words, document, lines, reading
from fieldkit.signal.recording import Recording
from fieldkit.signal.source import held, unnamed_channels
from fieldkit.signal.waterfall import waterfall

RATE_HZ = 500.0


def source(samples):
    return held(Recording(samples[:, None], RATE_HZ, unnamed_channels(1), "made", None, ()))


def sweep(from_hz, to_hz, duration_s=120.0, height=1.0):
    """A sine whose frequency goes evenly from one value to another."""
    t = np.arange(int(duration_s * RATE_HZ)) / RATE_HZ
    noise = 0.01 * np.random.default_rng(2).standard_normal(len(t))
    phase = 2 * np.pi * (from_hz * t + 0.5 * (to_hz - from_hz) / duration_s * t**2)
    return height * np.sin(phase) + noise


def test_a_run_up_is_followed():
    """The strongest line of each stretch is the frequency in its middle."""
    found = waterfall(source(sweep(20.0, 40.0)), up_to_hz=100.0)
    expected = 20.0 + 20.0 * found.time_s / 120.0
    assert found.strongest_hz == pytest.approx(expected, abs=found.resolution_hz)
    assert not found.steady
    assert "moves from 21" in reading(found, ())


def test_a_steady_sine_reads_its_rms_and_holds():
    """A sine of height 1 has an RMS of 0.7071; between two lines a Hann window reads up to 15 %
    less (Harris 1978, scalloping loss of the Hann window 1.42 dB)."""
    found = waterfall(source(sweep(30.0, 30.0)), up_to_hz=100.0, scale=2.0, unit="m/s^2")
    assert found.strongest_rms == pytest.approx(np.sqrt(2), rel=0.02)
    assert found.strongest_hz == pytest.approx(30.0, abs=0.01)
    assert found.steady
    assert "the speed does not change" in reading(found, ())
    off = waterfall(source(sweep(30.23, 30.23)), up_to_hz=100.0, scale=2.0)
    assert 0.84 * np.sqrt(2) < off.strongest_rms.mean() <= 1.01 * np.sqrt(2)


def test_columns_hold_the_line_where_it_is():
    found = waterfall(source(sweep(30.0, 30.0)), up_to_hz=100.0)
    column = np.argmax(found.rms, axis=1)
    width = found.frequency_hz[1] - found.frequency_hz[0]
    assert found.frequency_hz[column] == pytest.approx(30.0, abs=width)


def test_where_it_is_strongest_a_mode_is_suspected():
    """A run-up whose level is ten times larger near 30 Hz."""
    t = np.arange(60000) / RATE_HZ
    samples = sweep(20.0, 40.0) * (1 + 9 * np.exp(-(((t - 60.0) / 8.0) ** 2)))
    words = reading(waterfall(source(samples), up_to_hz=100.0), ())
    assert "strongest at 30" in words or "strongest at 29" in words


def test_the_order_is_named():
    orders = bands([Excitation("fan", (1800 / 60, 1800 / 60))], 0.0)
    found = waterfall(source(sweep(30.0, 30.0)), up_to_hz=100.0)
    assert "on fan 1x" in reading(found, orders)
    assert "(fan 1x)" in at_words(found, 0, orders)
    assert document("a.wav", found, orders)["steady"] is True
    assert lines("a.wav", found, orders)[0] == "a.wav"


def test_an_hour_is_read_in_no_more_than_a_few_hundred_stretches():
    class Endless:
        """Half an hour of silence with a hum, made as it is read; counts the largest read."""

        largest = 0

        def reading(self, channel):
            from contextlib import contextmanager

            @contextmanager
            def opened():
                def read(first, past):
                    Endless.largest = max(Endless.largest, past - first)
                    return np.sin(2 * np.pi * 25.0 * np.arange(first, past) / RATE_HZ)

                yield read

            return opened()

    short = source(sweep(30.0, 30.0, 10.0))
    frames = int(1800 * RATE_HZ)
    long = replace(short, stored=Endless(), frames=frames)
    found = waterfall(long, up_to_hz=100.0)
    assert len(found.time_s) <= 241
    assert Endless.largest <= frames / 200
    assert found.strongest_hz == pytest.approx(25.0, abs=0.05)


def test_what_is_too_short_or_not_there_is_told():
    with pytest.raises(Refusal, match="too short"):
        waterfall(source(np.zeros(400)), up_to_hz=100.0)
    with pytest.raises(InputError):
        waterfall(source(np.zeros(5000)), 3, up_to_hz=100.0)
