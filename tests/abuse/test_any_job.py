"""Any job that is valid, drawn by hypothesis: an answer or a reason, and an answer that can be."""

from __future__ import annotations

import math
from collections.abc import Iterator
from contextlib import suppress
from pathlib import Path
from typing import Any

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from fieldkit import workup
from fieldkit.errors import InputError, Refusal
from fieldkit.job.document import Job
from fieldkit.job.schema import parse_job
from fieldkit.progress import Progress
from fieldkit.sheet import documents
from fieldkit.span.supports import KINDS
from fieldkit.workup import StateModes

SIZES = ("1/2", "1", "2", "3", "4", "8", "12")
KINDS_BUT_BRANCH = sorted(set(KINDS) - {"branch"})
AXES = "xyz"
shares = st.floats(0.0, 1.0)
lengths = st.floats(0.3, 6.0).map(lambda value: round(value, 3))
stiffness = st.sampled_from(['"unknown"', '"rigid"', '"free"', '"2 MN/m"', '"1 N/m"', "1e9"])


@st.composite
def routes(draw: Any) -> list[tuple[str, float]]:
    """Legs along the axes, each across the one before."""
    legs: list[tuple[str, float]] = []
    for _ in range(draw(st.integers(1, 3))):
        axis = draw(st.sampled_from([a for a in AXES if not legs or a != legs[-1][0][1]]))
        legs.append((draw(st.sampled_from("+-")) + axis, draw(lengths)))
    return legs


@st.composite
def texts(draw: Any) -> str:
    """Text of a job file that keeps to the schema; some describe what cannot stand or vibrate."""
    legs = draw(routes())
    end = sum(length for _, length in legs)
    lines = ["fieldkit = 1", "[pipe]", f'size = "NPS {draw(st.sampled_from(SIZES))}"']
    lines += ['schedule = "40"', 'material = "carbon steel"', "[contents]", 'name = "water"']
    lines += ["[state.tapped]", f"fill = {draw(shares)}", "[state.running]", "fill = 1.0"]
    lines.append(f'temperature = "{draw(st.integers(0, 250))} degC"')
    for i, (direction, length) in enumerate(legs):
        lines += ["[[leg]]", f'direction = "{direction}"', f'length = "{length} m"']
        lines += ['bend_radius = "0.2 m"'] if i else []
    for _ in range(draw(st.integers(1, 4))):
        lines += ["[[support]]", f'at = "{_station(draw(shares), end)} m"']
        lines.append(f'kind = "{draw(st.sampled_from(KINDS_BUT_BRANCH))}"')
        if draw(st.booleans()):
            lines.append(f"vertical = {draw(stiffness)}")
    for _ in range(draw(st.integers(0, 2))):
        lines += ["[[mass]]", f'at = "{_station(draw(shares), end)} m"']
        lines.append(f'mass = "{draw(st.floats(0.0, 500.0))} kg"')
    lines += ["[[excitation]]", 'name = "pump"']
    lines.append(f'speed = "{draw(st.integers(100, 3600))} rpm"')
    if draw(st.booleans()):
        lines += ["[[measured]]", f'frequency = "{draw(st.floats(2.0, 60.0))} Hz"']
    lines += ["[goal]", 'up_to = "60 Hz"']
    return "\n".join(lines) + "\n"


def _station(share: float, end: float) -> float:
    return math.floor(1000 * share * end) / 1000


def job_of(text: str) -> Job | None:
    """The job, None where it is refused as input."""
    with suppress(InputError):
        return parse_job(text, Path("job.toml"))
    return None


def test_most_of_what_is_drawn_can_be_worked_out():
    """Otherwise the properties below would hold of nothing."""
    drawn = []
    worked = settings(max_examples=20, deadline=None, database=None, derandomize=True)
    worked(given(texts())(lambda text: drawn.append(job_of(text) is not None)))()
    assert sum(drawn) > 0.7 * len(drawn)


@given(texts())
@settings(max_examples=25, deadline=None, suppress_health_check=list(HealthCheck))
def test_modes_of_any_job_are_positive_and_within_the_span(text):
    """Finite frequencies in rising order, shapes that move somewhere on the pipe."""
    job = job_of(text)
    if job is None:
        return
    states: tuple[StateModes, ...] = ()
    with suppress(Refusal):
        states = workup.state_modes(job, Progress())
    for state in states:
        frequencies = [mode.frequency_hz for mode in state.modes]
        assert frequencies == sorted(frequencies)
        assert all(0 < f <= job.goal.up_to_hz and math.isfinite(f) for f in frequencies)
        assert all(0 <= mode.where_m <= job.span.length_m + 1e-9 for mode in state.modes)


@given(texts())
@settings(max_examples=4, deadline=None, suppress_health_check=list(HealthCheck))
def test_changes_of_any_job_lie_within_the_span(text):
    """Every station and chance of the whole chain can be; each missing step has a reason."""
    job = job_of(text)
    if job is None:
        return
    work = workup.run(job, Progress())
    if work.detuning is None:
        assert [refused.reason for refused in work.refused]
        return
    document = documents.detune(work.detuning, ())
    for key, value in named(document):
        if key in ("at_m", "to_m"):
            assert -1e-9 <= value <= job.span.length_m + 1e-9
        if key in ("chance", "chance_now", "chance_clear"):
            assert 0 <= value <= 1
        if key in ("median_hz", "low_hz", "high_hz"):
            assert value >= 0


def named(document: Any) -> Iterator[tuple[str, float]]:
    """Every number in a document with its key; none may be anything but finite."""
    pairs = document.items() if isinstance(document, dict) else enumerate(document)
    for key, value in pairs:
        if isinstance(value, dict | list | tuple):
            yield from named(value)
        elif isinstance(value, float | int) and not isinstance(value, bool):
            assert math.isfinite(value)
            yield str(key), value
