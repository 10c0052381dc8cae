"""The job files describe, as an engineer sees them, the plants that the simulation knows."""

from __future__ import annotations

import ast
import json
import math
import sys
from dataclasses import replace
from functools import cache
from typing import Any

import numpy as np
import pytest
from cure import clearance
from plants import PLANTS, Plant

from fieldkit.job.document import Job
from fieldkit.job.schema import load_job
from fieldkit.span.layout import PointMass, Span, State, Support
from fieldkit.span.modes import solve
from fieldkit.span.restraint import span_matrices
from fieldkit.span.structure import assemble
from fieldkit.span.supports import Spring, springs
from tests.samples import JOBS, SAMPLES

BY_FOLDER = {plant.folder: plant for plant in PLANTS}


@cache
def job_of(folder: str) -> Job:
    return load_job(SAMPLES / folder / "job.toml")


@cache
def truth_of(folder: str) -> dict[str, Any]:
    return json.loads((SAMPLES / folder / "truth.json").read_text(encoding="utf-8"))


def test_the_simulation_stands_on_its_own() -> None:
    """No module of it imports the program it is there to check."""
    for path in SAMPLES.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            names += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            known = sys.stdlib_module_names | {"numpy", "scipy", "soundfile"}
            beside = {other.stem for other in SAMPLES.glob("*.py")}
            assert {name.split(".")[0] for name in names} <= known | beside, path


NOT_OF_THE_PIPEWORK = {"speed", "absorber"}
"""Cures that the simulation of the plants does not build."""


@pytest.mark.parametrize("folder", JOBS)
def test_the_tape_is_within_one_percent_and_the_scales_within_the_tolerance(folder: str) -> None:
    job, plant = job_of(folder), BY_FOLDER[folder]
    stated = [leg.length_m for leg in job.span.legs]
    assert stated == pytest.approx([leg.length_m for leg in plant.legs], rel=0.01)
    assert [leg.direction for leg in job.span.legs] == [leg.direction for leg in plant.legs]
    stations = [support.at_m for support in job.span.supports]
    assert stations == pytest.approx([hold.at_m for hold in plant.holds], abs=0.02)
    for mass, lump in zip(job.span.masses, plant.lumps, strict=True):
        assert mass.mass_kg == pytest.approx(lump.mass_kg, rel=2 * mass.tolerance)
        assert mass.offset_m == pytest.approx(lump.offset_m, abs=1e-3)


@pytest.mark.parametrize("folder", JOBS)
def test_the_goal_and_the_machine_are_those_of_the_simulation(folder: str) -> None:
    job, plant = job_of(folder), BY_FOLDER[folder]
    (excitation,) = job.excitations
    machine = plant.machine
    speeds = (machine.slowest_rpm / 60, machine.fastest_rpm / 60)
    assert excitation.speed_hz == pytest.approx(speeds)
    assert list(excitation.orders) == list(machine.force_n)
    assert job.goal.margin == plant.margin
    assert job.goal.up_to_hz == plant.up_to_hz
    assert set(job.goal.allow) - NOT_OF_THE_PIPEWORK == set(plant.allow)
    assert np.ravel(job.goal.keep_out_m) == pytest.approx(np.ravel(plant.keep_out_m), abs=1e-3)


@pytest.mark.parametrize("folder", JOBS)
def test_true_stiffnesses_are_plausible_for_their_kind(folder: str) -> None:
    """Within 1.2 standard deviations of what the program assumes where the job does not know."""
    usual = {(s.support, s.axis): s for s in springs(job_of(folder).span)}
    for index, hold in enumerate(BY_FOLDER[folder].holds):
        assert {axis for i, axis in usual if i == index} - {"torsion"} == set(hold.springs) - {
            "twist"
        }
        for axis, stiffness in hold.springs.items():
            spring = usual[(index, "torsion" if axis == "twist" else axis)]
            doubt = max(1.2 * spring.sd_ln, 0.1)
            assert abs(math.log(stiffness / spring.stiffness)) < doubt, (index, axis)


@pytest.mark.parametrize("folder", JOBS)
@pytest.mark.parametrize("state", ["tapped", "running"])
def test_two_independent_models_agree_on_the_true_pipe(folder: str, state: str) -> None:
    """Lumped short members here, consistent long elements there: within 0.1 %."""
    job, truth = job_of(folder), truth_of(folder)
    span, extra = _true_span(job, truth), _twist_springs(truth)
    condition: State = getattr(job, state)
    up_to_hz = 2 * job.goal.up_to_hz
    structure = assemble(span, condition, up_to_hz=up_to_hz)
    stiffness, mass = span_matrices(structure, (*springs(span), *extra), span.masses)
    found, _ = solve(stiffness, mass, up_to_hz=up_to_hz)
    expected = [mode["frequency_hz"] for mode in truth["states"][state]["modes"]]
    assert found == pytest.approx(expected[: len(found)], rel=1e-3)


@pytest.mark.parametrize("folder", JOBS)
def test_the_pipe_shakes_now_and_one_change_cures_it(folder: str) -> None:
    """A mode stands within 5 % of an order; the best cure leaves 10 % beyond every band."""
    truth = truth_of(folder)
    running = [mode["frequency_hz"] for mode in truth["states"]["running"]["modes"]]
    orders = [(band["low_hz"] + band["high_hz"]) / 2 for band in truth["bands"]]
    assert min(abs(f / order - 1) for f in running for order in orders) < 0.05
    assert truth["clearance_now"] < 0
    best = truth["cures"][0]
    assert best["clearance"] > 0.1
    assert clearance(np.array(best["frequency_hz"]), BY_FOLDER[folder]) == pytest.approx(
        best["clearance"], abs=1e-3
    )


def _true_span(job: Job, truth: dict[str, Any]) -> Span:
    """The program's own description of the pipe as it truly is."""
    span = job.span
    nominal = span.material.modulus_at(job.tapped.temperature_k)
    stiffer = truth["states"]["tapped"]["modulus_pa"] / nominal
    rows = tuple((kelvin, stiffer * modulus) for kelvin, modulus in span.material.modulus_pa)
    lengths = truth["pipe"]["leg_length_m"]
    return replace(
        span,
        pipe=replace(span.pipe, wall_m=truth["pipe"]["wall_m"]),
        material=replace(span.material, modulus_pa=rows),
        legs=tuple(replace(leg, length_m=m) for leg, m in zip(span.legs, lengths, strict=True)),
        supports=tuple(_true_support(hold) for hold in truth["supports"]),
        masses=tuple(
            PointMass(m["at_m"], m["mass_kg"], offset_m=tuple(m["offset_m"]))
            for m in truth["masses"]
        ),
    )


def _true_support(hold: dict[str, Any]) -> Support:
    stated = {axis: k for axis, k in hold["springs"].items() if axis != "twist"}
    return Support(hold["at_m"], "free", **stated)


def _twist_springs(truth: dict[str, Any]) -> list[Spring]:
    return [
        Spring(i, hold["at_m"], "torsion", hold["springs"]["twist"], 0.0)
        for i, hold in enumerate(truth["supports"])
        if "twist" in hold["springs"]
    ]


def test_every_plant_has_its_folder() -> None:
    assert tuple(BY_FOLDER) == JOBS
    assert all(isinstance(plant, Plant) for plant in BY_FOLDER.values())
