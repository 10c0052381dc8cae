"""The advice says what was found, how sure it is, and what is missing."""

from __future__ import annotations

from dataclasses import replace

from fieldkit.detune.evidence import Evidence
from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.job.document import Job
from fieldkit.sheet import advice, documents, tables
from fieldkit.sheet.plain import percent
from fieldkit.workup import StepRefusal, Workup
from tests.detune.lines import RUNNING, TAPPED, booster, booster_answer


def workup() -> Workup:
    span, _, found = booster()
    _, answer = booster_answer()
    job = Job(
        "Booster [red]line[/red]\x1b[2J",
        "SI",
        span,
        TAPPED,
        RUNNING,
        (Excitation("pump", (12.0, 13.0)),),
        goal=Goal(up_to_hz=100.0),
    )
    return Workup(job, (), Evidence(found.measured), (), found, answer)


def text(work: Workup) -> str:
    return " ".join(" ".join(advice.lines(work)).split())


def test_the_cure_and_its_chance_are_in_the_advice():
    said = text(workup())
    best = workup().detuning.fixes[0]
    assert best.summary in said
    assert f"chance {percent(best.chance)}" in said


def test_the_resonance_is_named_with_its_source():
    assert "lies in reach of pump 1x" in text(workup())


def test_cautions_are_always_there():
    said = text(workup())
    assert "ask the operator" in said
    assert "local code" in said


def test_hostile_titles_are_harmless_and_markup_is_just_text():
    said = text(workup())
    assert "\x1b" not in said
    assert "[red]line[/red]" in said


def test_a_missing_part_is_told_with_its_reason():
    bare = replace(
        workup(),
        match=None,
        detuning=None,
        refused=(StepRefusal("detune", "no change can be promised; settle the match first"),),
    )
    assert "settle the match first" in text(bare)


def test_no_good_fix_is_said_plainly():
    work = workup()
    weak = replace(work.detuning.fixes[0], chance=0.4)
    said = text(replace(work, detuning=replace(work.detuning, fixes=(weak,))))
    assert "No single change reaches the wanted chance of 90 %" in said


def test_tables_and_documents_hold_the_same_fixes():
    work = workup()
    lines = " ".join(" ".join(tables.detune(work.detuning, "SI")).split())
    for fix in documents.detune(work.detuning)["fixes"]:
        assert fix["summary"] in lines


def test_match_table_names_every_unknown():
    found = workup().match
    lines = "\n".join(tables.match(found, "US"))
    for parameter in found.parameters:
        assert parameter.name in lines
