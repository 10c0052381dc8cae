"""Lines of a text file are those of its whole text, without holding it in memory."""

from __future__ import annotations

import tracemalloc
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.signal import line_index
from fieldkit.signal.recording import load
from fieldkit.signal.text_lines import open_lines

PIECES = st.sampled_from(["1.5", ",", " ", "\n", "\r\n", "\r", "\n\n", "é", "µ", "x" * 9, "#"])


def lines_of(path: Path) -> list[str]:
    with open_lines(path) as lines:
        assert len(lines) == len(list(lines))
        return list(lines)


@given(pieces=st.lists(PIECES, min_size=1, max_size=60), chunk=st.integers(1, 40))
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "latin-1"])
@settings(max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_lines_are_those_of_the_whole_text(tmp_path, monkeypatch, encoding, pieces, chunk):
    """Every line end, however the file is cut into chunks: the ends of lines are one character."""
    text = "a" + "".join(pieces)
    path = tmp_path / "a.txt"
    path.write_bytes(text.encode(encoding))
    monkeypatch.setattr(line_index, "_CHUNK_BYTES", chunk)
    assert lines_of(path) == text.replace("\r\n", "\n").replace("\r", "\n").split("\n")


def test_lines_are_asked_for_one_by_one_or_as_a_slice(tmp_path):
    path = tmp_path / "a.txt"
    path.write_text("".join(f"{i}\n" for i in range(5000)))
    with open_lines(path) as lines:
        assert len(lines) == 5001
        assert (lines[0], lines[4999], lines[5000], lines[-2]) == ("0", "4999", "", "4999")
        assert lines[10:13] == ["10", "11", "12"]
        assert lines[4998:9000] == ["4998", "4999", ""]
        assert lines[3:3] == []
        with pytest.raises(IndexError):
            lines[5001]


def test_endless_line_is_refused_with_its_number(tmp_path, monkeypatch):
    monkeypatch.setattr(line_index, "LONGEST_LINE_BYTES", 2**20)
    path = tmp_path / "a.csv"
    path.write_text("t,x\n0,1\n" + "1," * 2**20 + "\n")
    with pytest.raises(InputError, match=r"a\.csv, line 3: the line is 2 MiB long"):
        lines_of(path)


def test_rows_among_comments_keep_their_line_numbers(tmp_path):
    """The bad value is in line 30,006 of the file, after comments and blank lines."""
    rows = [f"{i / 1000:.3f},{i % 9}" for i in range(30_000)]
    rows[10:10] = ["# a note", "", "   "]
    rows[25_000:25_000] = ["% another", "// one more"]
    rows[30_004] = "30.000,oops"
    path = tmp_path / "a.csv"
    path.write_text("t,x\n" + "\n".join(rows) + "\n")
    with pytest.raises(InputError, match=r"a\.csv, line 30006: 'oops' in column 2"):
        load(path)


def test_memory_for_a_long_text_is_that_of_its_numbers(tmp_path):
    """Under 60 bytes a row of time and one channel; as text its lines alone would take more."""
    count = 400_000
    path = tmp_path / "a.csv"
    path.write_text("t,x\n" + "".join(f"{i / 2000:.4f},{i % 97 / 7:.6f}\n" for i in range(count)))
    load(path)
    tracemalloc.start()
    recording = load(path)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert recording.samples.shape == (count, 1)
    assert recording.rate_hz == 2000.0
    np.testing.assert_allclose(recording.samples[:3, 0], np.arange(3) / 7, atol=1e-6)
    assert peak < 60 * count
