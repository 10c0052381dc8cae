"""``fieldkit detune JOB --fix N`` and ``install`` in the JSON: the contract of the answer."""

from __future__ import annotations

from functools import cache

import pytest

from fieldkit.cli.samples import sample_jobs
from fieldkit.quantity import show
from tests.cli.running import fieldkit

JOBS = {path.parent.name: path for path in sample_jobs()}


@cache
def answer(name, *more):
    ran = fieldkit("detune", JOBS[name], "--json", *more)
    assert ran.status == 0, ran.err
    return ran.document


def test_every_change_says_what_it_takes_to_install_it():
    for fix in answer("glycol-booster")["fixes"]:
        (kind,) = fix["change"]
        found = fix["install"]
        if kind == "all_of":
            assert len(found["all_of"]) == len(fix["change"]["all_of"])
            continue
        assert set(found) == {
            "at_m", "stiffness_needed", "kept_as_drawn", "fails_below", "fails_above",
            "braced_to", "reach_m", "brackets", "added_load_n", "sag_mm", "bending_stress_mpa",
            "span_rule", "thermal_movement_mm", "thermal_force_n", "held", "cautions",
        }  # fmt: skip
        assert len(found["sag_mm"]) == len(found["bending_stress_mpa"]) == 2
        assert "responsible piping engineer" in found["cautions"][-1]
        if kind in ("add_support", "stiffen_support"):
            stated = fix["change"][kind]
            for key, value in found["stiffness_needed"].items():
                assert stated[key] == value
            assert found["brackets"]
            assert set(found["brackets"][0]) == {
                "form", "section", "standard", "longest_m", "length_m", "reaches", "mass_kg",
                "vertical_n_per_m", "lateral_n_per_m",
            }  # fmt: skip
        else:
            assert found["stiffness_needed"] is None


def test_a_promise_ends_below_what_is_drawn():
    """Whatever is promised the wanted chance fails somewhere below, never above, its drawing."""
    ends = [
        (fix["install"]["fails_below"], fix["install"]["stiffness_needed"])
        for fix in answer("glycol-booster")["fixes"]
        if (fix["install"].get("fails_below"))
    ]
    assert ends
    for below, drawn in ends:
        assert all(below[key] <= 1.001 * drawn[key] for key in drawn)


def test_one_change_in_full_in_the_units_of_the_job():
    ran = fieldkit("detune", JOBS["small-bore"], "--fix", 1, "--reach", "1 ft")
    assert ran.status == 0, ran.err
    assert "Draw it" in ran.out
    assert "12 in to the header" in ran.out
    assert "kip/in" in ran.out
    assert "never to structure" in ran.out
    assert "1500 psi" in ran.out
    assert "responsible piping engineer" in " ".join(ran.out.split())
    assert " 2. chance" not in ran.out


def test_reach_and_number_choose():
    near = answer("small-bore", "--fix", 1, "--reach", "0.2 m")["fixes"]
    far = answer("small-bore", "--fix", 1, "--reach", "0.6 m")["fixes"]
    assert [fix["rank"] for fix in (*near, *far)] == [1, 1]
    lightest = [fix["install"]["brackets"][0]["mass_kg"] for fix in (*near, *far)]
    assert lightest[0] < lightest[1]


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("--fix", 99), "there is no change 99"),
        (("--reach", "9 m"), "no bracket reaches 9 m"),
        (("--reach", "soon"), "soon"),
    ],
)
def test_bad_choices_are_refused_in_one_sentence(words, says):
    ran = fieldkit("detune", JOBS["small-bore"], *words)
    assert ran.status == 2
    assert says in ran.err
    assert "Traceback" not in ran.err


def test_the_caution_names_the_same_least_stiffness_as_the_installation():
    """Both are judged on the members that had no say in the choice."""
    told = [
        (fix["cautions"][0], min(fix["install"]["fails_below"].values()))
        for fix in answer("glycol-booster")["fixes"]
        if "must give at least" in fix["cautions"][0] and fix["install"].get("fails_below")
    ]
    assert told
    for caution, least in told:
        assert f"at least {show(least, 'stiffness', 'SI', 2)}: below" in caution
