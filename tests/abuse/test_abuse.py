"""A few hostile inputs of every kind, and that the judge of them can tell."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

from tests.abuse import mutations, places
from tests.abuse.__main__ import corpus
from tests.abuse.case import INPUT, Case
from tests.abuse.trial import LIMIT_BYTES, Ended, Tally, in_own_process, judged, tried

SOME = (
    "wav of 43 bytes",
    "wav data size large",
    "wav channels 65535",
    "wav rate 1000000",
    "text as wav",
    "archive as csv",
    "flac PCM_16 cut",
    "samples nan",
    "samples constant",
    "1e9 samples stated",
    "csv cell escape",
    "csv cell many digits",
    "csv header script",
    "csv header same twice",
    "csv clock backwards",
    "csv utf-16",
    "csv binary in the middle",
    "csv endless line",
    "job binary",
    "job deep arrays",
    "job deep tables",
    "job key twice",
    "job version huge",
    "job microscopic",
    "title c1",
    "name markup",
    "file path",
    "title right to left",
    "length = nan",
    "speed = -1e308",
    "201 of support",
    "tap.wav is a pipe",
    "job.toml is a pipe",
    "job.toml links to itself",
    "tap.wav unreadable",
    "link to nothing",
    "endless device",
    "name of escapes",
    "recording vanishes",
    "sheet over the job",
    "response over the tap",
)
CASES = {case.name: case for case in corpus(1, 0)}


def test_the_corpus_is_as_large_as_it_should_be():
    """Hundreds of inputs, none of them twice."""
    names = [case.name for case in corpus(1, 10)]
    assert len(set(names)) == len(names) >= 300


@pytest.mark.parametrize("name", SOME)
def test_hostile_input_ends_in_a_result_or_a_sentence(name):
    """Status 0, 1 or 2, no traceback, nothing overwritten, nothing but text printed."""
    tally = tried([CASES[name]], Tally())
    assert not tally.failures
    assert tally.results + tally.sentences == tally.runs > 0


def test_mutated_inputs_end_in_a_result_or_a_sentence():
    """Thirty of one seed."""
    assert not tried(mutations.cases(20, 10), Tally()).failures


@pytest.mark.skipif(not places.can_mount(), reason="only root may mount a small file system")
def test_full_disk_leaves_what_was_there():
    """A sentence, and nothing half written over what there was."""
    tally = tried([CASES["disk full of samples"]], Tally())
    assert not tally.failures
    assert tally.sentences == tally.runs == 1


def test_a_program_of_its_own_is_measured():
    """Status, sentence, processor time and memory of a real process."""
    ended = in_own_process(["peaks", "no such file.wav"])
    assert ended.status == 2
    assert "there is no such file" in ended.err
    assert 0 < ended.seconds < 10
    assert 1e7 < ended.most_bytes < LIMIT_BYTES


GOOD = Ended(0, "an answer\n", "", 0.1, 1e6)
BAD = {
    "broken": Ended(70, "", "fieldkit failed on this input", 0.1, 1e6),
    "killed": Ended(-9, "", "", 0.1, 1e6),
    "silent": Ended(2, "", "", 0.1, 1e6),
    "traceback": Ended(1, "", "Traceback (most recent call last):", 0.1, 1e6),
    "talkative": Ended(2, "", "a\n" * 40, 0.1, 1e6),
    "escapes": Ended(0, "title \x1b[2J", "", 0.1, 1e6),
    "turned": Ended(0, "title \u202etxt", "", 0.1, 1e6),
    "not a number": Ended(0, '{"frequency_hz": NaN}', "", 0.1, 1e6),
    "slow": Ended(0, "an answer", "", 11.0, 1e6),
    "large": Ended(0, "an answer", "", 0.1, 6e8),
}


@pytest.mark.parametrize("fault", BAD)
def test_the_judge_finds_each_fault(fault):
    """One fault each, and none in a good ending."""
    assert list(judged(BAD[fault]))
    assert not list(judged(GOOD))


def test_an_overwritten_input_is_found():
    """By its content, whatever the command says."""

    @contextmanager
    def meddling(folder: Path) -> Iterator[None]:
        yield
        (folder / "job.toml").write_text("gone")

    def job(folder: Path) -> Path:
        path = folder / "job.toml"
        path.write_text("earlier work")
        return path

    tally = tried([Case("overwritten", job, (("span", INPUT),), meddling)], Tally())
    assert ["job.toml was overwritten" in failure for failure in tally.failures] == [True]
