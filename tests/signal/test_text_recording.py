"""Recordings from columns of numbers, and the line of what is wrong in them."""

from __future__ import annotations

import contextlib
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from fieldkit.errors import InputError
from fieldkit.signal.recording import Channel, load

RATE_HZ = 2048.0
N = 600
T = np.arange(N) / RATE_HZ
X = 1.5 * np.sin(2 * np.pi * 25 * T)
Y = 0.4 * np.cos(2 * np.pi * 60 * T)


def rows(
    *columns: np.ndarray, delimiter: str = ",", decimal: str = ".", fmt: str = "%.7f"
) -> list[str]:
    cells = [[(fmt % value).replace(".", decimal) for value in column] for column in columns]
    return [delimiter.join(row) for row in zip(*cells, strict=True)]


def file(folder: Path, lines: list[str] | str | bytes, encoding: str = "utf-8") -> Path:
    path = folder / "a.csv"
    text = "\n".join(lines) if isinstance(lines, list) else lines
    path.write_bytes(text if isinstance(text, bytes) else text.encode(encoding))
    return path


def refusal(path: Path, **options: float) -> InputError:
    with pytest.raises(InputError) as caught:
        load(path, **options)
    assert str(path) in str(caught.value)
    assert str(caught.value).isprintable()
    return caught.value


@pytest.mark.parametrize(
    ("delimiter", "decimal"),
    [(delimiter, ".") for delimiter in (",", ";", "\t", " ", "   ", " ; ")]
    + [(delimiter, ",") for delimiter in (";", "\t", " ", "   ", " ; ")],
)
def test_delimiter_and_decimal_mark_are_found(tmp_path, delimiter, decimal):
    lines = rows(T, X, Y, delimiter=delimiter, decimal=decimal)
    recording = load(file(tmp_path, lines))
    np.testing.assert_allclose(recording.samples, np.column_stack([X, Y]), atol=1e-7)
    assert recording.rate_hz == RATE_HZ
    assert recording.full_scale is None
    assert recording.notes == ()


def test_decimal_comma_inside_quotes_is_no_delimiter(tmp_path):
    lines = ['"Time (s)","acc (g)"']
    lines += [f'"{a}","{b}"'.replace(".", ",") for a, b in zip(T, X, strict=True)]
    recording = load(file(tmp_path, lines))
    np.testing.assert_allclose(recording.samples[:, 0], X)
    assert recording.channels == (Channel("acc", "acceleration", 9.80665),)


@given(
    delimiter=st.sampled_from([",", ";", "\t", " "]),
    decimal=st.sampled_from([".", ","]),
    unit=st.sampled_from(
        [("acc [m/s2]", 1.0), ("Accel (g)", 9.80665), ("velocity mm/s", 1e-3), ("d [um]", 1e-6)]
    ),
    time=st.sampled_from([("t (ms)", 1e3), ("time [s]", 1.0), ("Time (us)", 1e6), (None, 1.0)]),
    end=st.sampled_from(["\n", "\r\n", "\r", "\n\n", "\n# remark\n"]),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "latin-1"]),
    values=st.lists(st.floats(-1e6, 1e6).map(lambda v: round(v, 6)), min_size=8, max_size=40),
    rate_hz=st.integers(100, 20_000),
)
@settings(
    max_examples=80,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
def test_what_is_written_is_read(
    tmp_path, delimiter, decimal, unit, time, end, encoding, values, rate_hz
):
    """A round trip over delimiters, decimal marks, units, line ends and encodings."""
    if delimiter == decimal:
        delimiter = ";"
    if len(set(values)) == 1:
        values = [*values[:-1], values[0] + 1.0]
    times = time[1] * np.arange(len(values)) / rate_hz
    body = rows(times, np.array(values), delimiter=delimiter, decimal=decimal, fmt="%.9g")
    header = [delimiter.join([time[0], unit[0]])] if time[0] else []
    recording = load(file(tmp_path, end.join(header + body), encoding))
    np.testing.assert_allclose(recording.samples[:, 0], values, rtol=1e-8)
    assert recording.rate_hz == pytest.approx(rate_hz, rel=1e-6)
    if time[0]:
        assert recording.channels[0].scale == pytest.approx(unit[1])


@pytest.mark.parametrize(
    ("label", "channel"),
    [
        ("acc [m/s2]", Channel("acc", "acceleration", 1.0)),
        ("acc [m/s^2]", Channel("acc", "acceleration", 1.0)),
        ("acc (m/s²)", Channel("acc", "acceleration", 1.0)),
        ("a_vert (m s-2)", Channel("a_vert", "acceleration", 1.0)),
        ("Accel (g)", Channel("Accel", "acceleration", 9.80665)),
        ("Accel g", Channel("Accel", "acceleration", 9.80665)),
        ("acc_g", Channel("acc", "acceleration", 9.80665)),
        ("Acceleration in mg", Channel("Acceleration", "acceleration", 9.80665e-3)),
        ("velocity mm/s", Channel("velocity", "velocity", 1e-3)),
        ("Z {in/s}", Channel("Z", "velocity", 0.0254)),
        ("disp <µm>", Channel("disp", "displacement", 1e-6)),
        ("gap (mil)", Channel("gap", "displacement", 25.4e-6)),
        ("mic (Pa)", Channel("mic", "pressure", 1.0)),
        ("p [MPa]", Channel("p", "pressure", 1e6)),
        ("p [mPa]", Channel("p", "pressure", 1e-3)),
        ("acceleration", Channel("acceleration", "acceleration", None)),
        ("sensor (V)", Channel("sensor (V)", None, None)),
        ("Line in", Channel("Line in", None, None)),
        ("channel g", Channel("channel g", None, None)),
        ("", Channel("channel 1", None, None)),
    ],
)
def test_label_says_name_quantity_and_unit(tmp_path, label, channel):
    recording = load(file(tmp_path, [f"t (s);{label}", *rows(T, X, delimiter=";")]))
    (found,) = recording.channels
    assert (found.name, found.quantity) == (channel.name, channel.quantity)
    assert found.scale == pytest.approx(channel.scale)


def test_name_and_unit_that_contradict_leave_the_channel_uncalibrated(tmp_path):
    recording = load(file(tmp_path, ["t (s),velocity (g)", *rows(T, X)]))
    assert recording.channels == (Channel("velocity (g)", None, None),)
    assert "contradict each other" in recording.notes[0]


def test_units_may_stand_on_their_own_line(tmp_path):
    header = ["Plant 7, north rack", "", "Time;Inlet;Outlet", "ms;m/s2;mm/s"]
    recording = load(file(tmp_path, [*header, *rows(1e3 * T, X, Y, delimiter=";")]))
    assert recording.rate_hz == RATE_HZ
    assert recording.channels == (
        Channel("Inlet", "acceleration", 1.0),
        Channel("Outlet", "velocity", 1e-3),
    )


def test_labels_may_stand_in_a_comment_and_be_split_by_spaces(tmp_path):
    recording = load(file(tmp_path, ["% t (s) acc (g) y [mm/s]", *rows(T, X, Y, delimiter=" ")]))
    assert [c.name for c in recording.channels] == ["acc", "y"]
    assert [c.scale for c in recording.channels] == [9.80665, 1e-3]


def test_labels_out_of_a_file_cannot_carry_control_characters(tmp_path):
    recording = load(file(tmp_path, ["t (s),a\x1b[31m\x07b", *rows(T, X)]))
    assert recording.channels[0].name == "a [31m b"


@pytest.mark.parametrize(
    ("header", "rate_hz"),
    [
        ("# rate 2048 Hz", 2048),
        ("fs=2048", 2048),
        ("// sample rate: 2048", 2048),
        ("Sample Rate (kHz);2,048", 2048),
        ("Sampling frequency [Hz]: 1e3", 1000),
        ("% samplerate 51.2 kHz", 51_200),
        ("Sample rate;2048;Hz", 2048),
        ("# dt = 0.5 ms", 2000),
        ("Sampling interval: 0.00025", 4000),
    ],
)
def test_rate_may_be_stated_in_the_header(tmp_path, header, rate_hz):
    decimal = "," if "," in header else "."
    lines = [header, "a;b", *rows(X, Y, delimiter=";", decimal=decimal)]
    recording = load(file(tmp_path, lines))
    assert recording.rate_hz == pytest.approx(rate_hz)
    assert [c.name for c in recording.channels] == ["a", "b"]


def test_one_column_needs_only_a_rate(tmp_path):
    for decimal in ".,":
        recording = load(file(tmp_path, rows(X, decimal=decimal)), rate_hz=500.0)
        np.testing.assert_allclose(recording.samples[:, 0], X, atol=1e-7)
        assert recording.rate_hz == 500.0


def test_stated_rate_wins_over_the_header_where_there_is_no_time(tmp_path):
    assert load(file(tmp_path, ["# fs=2048", *rows(X, Y)]), rate_hz=1000.0).rate_hz == 1000.0


def test_column_that_counts_the_samples_is_neither_time_nor_channel(tmp_path):
    counts = np.arange(1, N + 1)
    lines = [f"{i},{x:.6f}" for i, x in zip(counts, X, strict=True)]
    assert load(file(tmp_path, lines), rate_hz=RATE_HZ).samples.shape == (N, 1)
    named = load(file(tmp_path, ["sample,x", *lines]), rate_hz=RATE_HZ)
    assert [c.name for c in named.channels] == ["x"]
    assert "no sampling rate is known" in refusal(file(tmp_path, lines)).what
    whole = [f"{i},{abs(1000 * x):.0f}" for i, x in zip(counts, X, strict=True)]
    assert load(file(tmp_path, whole), rate_hz=RATE_HZ).samples.max() == 1500.0


@pytest.mark.parametrize("fmt", ["%.4f", "%.6f", "%.6g", "%.5e"])
def test_times_written_with_few_digits_are_even(tmp_path, fmt):
    """Rounding in the file is no jitter: nothing is resampled."""
    t = np.arange(3000) / RATE_HZ
    x = np.random.default_rng(1).standard_normal(3000)
    lines = [f"{fmt % a},{b:.5f}" for a, b in zip(t, x, strict=True)]
    recording = load(file(tmp_path, ["time (s),x", *lines]))
    assert recording.rate_hz == RATE_HZ
    assert recording.notes == ()
    np.testing.assert_allclose(recording.samples[:, 0], x, atol=1e-5)


def test_stated_rate_helps_times_too_coarse_to_tell_samples_apart(tmp_path):
    lines = ["t (s),x", *[f"{a:.3f},{b:.5f}" for a, b in zip(T, X, strict=True)]]
    assert load(file(tmp_path, lines), rate_hz=RATE_HZ).rate_hz == RATE_HZ
    error = refusal(file(tmp_path, lines))
    assert "the time is the same as in the row before" in error.what
    assert error.place.line == 3


@pytest.mark.parametrize(
    "stamp",
    [
        "2024-03-09T23:59:59.{:06d}",
        "2024-03-09 23:59:59.{:06d}",
        "2024-03-09 23:59:59.{:06d}Z",
        "23:59:59,{:06d}",
    ],
)
@pytest.mark.parametrize("delimiter", [";", "\t"])
def test_clock_times_are_times(tmp_path, stamp, delimiter):
    micros = np.round(1e6 * np.arange(500) / 1000.0).astype(int)
    lines = [f"{stamp.format(m)}{delimiter}{x:.5f}" for m, x in zip(micros, X, strict=False)]
    recording = load(file(tmp_path, [f"when{delimiter}acc (g)", *lines]))
    assert recording.rate_hz == 1000.0
    assert recording.channels[0].name == "acc"


def test_clock_times_run_over_midnight_with_a_date_in_its_own_column(tmp_path):
    stamps = [("2024-02-29 23:59:59", 700), ("2024-03-01 00:00:00", 0)]
    lines = [
        f"{when}.{1000 * (start + k):06d} {x:.5f}"
        for (when, start), count in zip(stamps, (300, 300), strict=True)
        for k, x in enumerate(X[:count])
    ]
    recording = load(file(tmp_path, ["date time acc(g)", *lines]))
    assert recording.rate_hz == 1000.0
    assert [c.scale for c in recording.channels] == [9.80665]


def test_time_column_in_an_unknown_unit_is_not_guessed(tmp_path):
    error = refusal(file(tmp_path, ["time,x", *rows(1e3 * T, X)]))
    assert "the time column has no unit" in error.what
    assert "t (ms)" in error.remedy
    stated = load(file(tmp_path, ["# rate 2048 Hz", "time,x", *rows(1e3 * T, X)]))
    assert stated.rate_hz == RATE_HZ


def test_stated_rate_that_contradicts_the_time_column_is_refused(tmp_path):
    path = file(tmp_path, ["t (s),x", *rows(T, X)])
    error = refusal(path, rate_hz=2000.0)
    assert "gives 2048 Hz, and 2000 Hz was stated" in error.what


def test_time_column_wins_over_a_remark_and_says_so(tmp_path):
    recording = load(file(tmp_path, ["# rate 4096 Hz", "t (s),x", *rows(T, X)]))
    assert recording.rate_hz == RATE_HZ
    assert "the header states 4096 Hz" in recording.notes[0]


@pytest.mark.parametrize("kind", ["jitter", "lost samples"])
def test_uneven_samples_are_resampled_and_said_so(tmp_path, kind):
    """A sine at a tenth of the rate keeps its level within 1 % (cubic interpolation)."""
    rng = np.random.default_rng(3)
    t = np.arange(3000) / 1000.0
    if kind == "jitter":
        t = t + rng.uniform(-2e-4, 2e-4, len(t))
    else:
        t = np.delete(t, 50 * np.arange(1, 50))
    lines = rows(t, np.sin(2 * np.pi * 100 * t), fmt="%.9f")
    recording = load(file(tmp_path, ["t (s),x", *lines]))
    assert recording.rate_hz == pytest.approx(1000.0, rel=0.01)
    assert "were not evenly spaced: steps of" in recording.notes[0]
    assert "cubic interpolation" in recording.notes[0]
    even_t = t[0] + np.arange(len(recording.samples)) / recording.rate_hz
    error = recording.samples[20:-20, 0] - np.sin(2 * np.pi * 100 * even_t[20:-20])
    assert np.sqrt(2 * np.mean(error**2)) < 0.01


def test_gap_is_refused_at_its_line(tmp_path):
    t = np.where(np.arange(N) < 300, T, T + 0.02)
    error = refusal(file(tmp_path, ["t (s),x", *rows(t, X)]))
    assert "a gap of 20.49 ms in the recording, where a step is 0.4883 ms" in error.what
    assert error.place.line == 302


def bad_row(folder: Path, row: str, at: int = 400) -> InputError:
    lines = rows(T, X)
    lines[at] = row
    error = refusal(file(folder, ["# pump", "t (s),acc (g)", *lines]))
    assert error.place.line == at + 3
    return error


@pytest.mark.parametrize("text", ["nan", "NaN", "inf", "-Infinity", "#N/A", "1.#IND"])
def test_value_that_is_not_finite_is_named_with_its_line(tmp_path, text):
    assert (
        f"{text!r} in column 2 is no finite number" in bad_row(tmp_path, f"0.1953125,{text}").what
    )


@pytest.mark.parametrize("text", ["1e999", "-4e38"])
def test_overflow_is_named_with_its_line(tmp_path, text):
    assert "too large to be measured" in bad_row(tmp_path, f"0.1953125,{text}").what


def test_not_finite_in_the_first_row_is_found_too(tmp_path):
    assert "'nan' in column 2" in bad_row(tmp_path, "0,nan", at=0).what


def test_text_among_numbers_is_quoted_safely(tmp_path):
    error = bad_row(tmp_path, "0.1953125,overload\x1b[2J" + "x" * 500)
    assert "'overload\\x1b[2J" in error.what
    assert len(error.what) < 100


@pytest.mark.parametrize("row", ["0.1953125", "0.1953125,", "0.1953125,1,2", "0.1953125,1,2,"])
def test_row_with_other_columns_is_named_with_its_line(tmp_path, row):
    assert "where 2 are expected" in bad_row(tmp_path, row).what


def test_empty_cell_is_named_with_its_line(tmp_path):
    assert "column 1 is empty" in bad_row(tmp_path, ",0.5").what


def test_time_running_backwards_is_named_with_its_line(tmp_path):
    error = bad_row(tmp_path, "0.1,0.5")
    assert "time runs backwards, from 0.1948242 s to 0.1 s" in error.what


def test_repeated_time_is_named_with_its_line(tmp_path):
    assert "same as in the row before" in bad_row(tmp_path, f"{T[399]:.7f},0.5").what


def test_only_time_is_refused(tmp_path):
    assert "no column of samples" in refusal(file(tmp_path, ["t (s)", *rows(T)])).what


def test_silence_is_refused(tmp_path):
    assert "is silent" in refusal(file(tmp_path, ["t (s),x", *rows(T, 0 * X)])).what


def test_rate_out_of_range_is_refused(tmp_path):
    error = refusal(file(tmp_path, ["t (s),x", *rows(100 * T, X)]))
    assert "20.48 Hz is out of range" in error.what


def test_rates_that_contradict_each_other_are_refused(tmp_path):
    error = refusal(file(tmp_path, ["# rate 2048 Hz", "# fs = 1000", *rows(X, Y)]))
    assert "several rates: 2048 Hz, 1000 Hz" in error.what


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"\n\n \t\n", "the file is empty"),
        (b"just words\nand more\n", "no row of numbers was found"),
        (b"\x00\x01\x02\x03" * 50, "binary data"),
        (b"\xff\xfe1\x00,\x00\x00\xd8", "not valid UTF-16"),
    ],
)
def test_what_holds_no_table_is_refused(tmp_path, content, message):
    assert message in refusal(file(tmp_path, content)).what


def test_comma_that_may_be_either_mark_is_refused(tmp_path):
    error = refusal(file(tmp_path, ["12,345", "11,250", "10,118"]), rate_hz=1000.0)
    assert "whole numbers or as numbers with a decimal comma" in error.what
    assert error.place.line == 1
    error = refusal(file(tmp_path, rows(abs(X), abs(Y), decimal=",")), rate_hz=1000.0)
    assert "decimal comma" in error.what


def test_blank_lines_and_empty_columns_do_not_matter(tmp_path):
    lines = ["t (s);acc (g);;", *[f"{row};;" for row in rows(T, X, delimiter=";")]]
    recording = load(file(tmp_path, "\n" * 1000 + "\n\n".join(lines) + "\n" * 1000))
    assert recording.samples.shape == (N, 1)
    assert recording.rate_hz == RATE_HZ


def test_second_time_column_is_a_channel_of_no_quantity(tmp_path):
    """What a column of seconds measures is not known, and no unit is made of it."""
    lines = ["t (s),elapsed (s)", *rows(T, Y)]
    (channel,) = load(file(tmp_path, lines)).channels
    assert (channel.name, channel.quantity, channel.scale) == ("elapsed", None, None)


def test_endless_line_is_no_row(tmp_path):
    """Told at once, without reading a million cells."""
    error = refusal(file(tmp_path, ["t (s),acc (g)", "1," * 100_000]))
    assert "200,000 characters" in error.what
    assert error.place.line == 2


def test_long_file_is_read_in_blocks_with_the_right_line_for_its_error(tmp_path):
    lines = [f"{0.1 * (k % 7):.1f};{k % 5}" for k in range(45_000)]
    path = file(tmp_path, ["# fs = 1000", *lines])
    assert load(path).samples.shape == (45_000, 2)
    lines[44_321] = "0.3;x"
    assert refusal(file(tmp_path, ["# fs = 1000", *lines])).place.line == 44_323


@given(
    st.lists(
        st.one_of(
            st.text('0123456789.,;- \te"#:nait', max_size=20),
            st.floats(allow_nan=True).map(str),
            st.just("0.5,1.5"),
        ),
        max_size=12,
    ).map("\n".join)
    | st.binary(max_size=80)
)
@settings(
    max_examples=150,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
def test_any_text_ends_in_a_recording_or_a_sentence(tmp_path, content):
    path = file(tmp_path, content)
    with contextlib.suppress(InputError):
        recording = load(path, rate_hz=1000.0)
        assert np.isfinite(recording.samples).all()
        assert recording.samples.shape[1] == len(recording.channels) > 0
