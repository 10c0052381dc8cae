"""What is needed to install a fix, as JSON and as text."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from fieldkit.detune.install import AtRest, Heated, Installation
from fieldkit.quantity import show
from fieldkit.sheet.plain import Cells, paragraph, table
from fieldkit.span.static import WeightAnswer
from fieldkit.steel.brackets import Bracket

Document = dict[str, Any]
Fold = Callable[[str, int, str], list[str]]
"""``plain.paragraph``, or ``plain.unwrapped``."""
_LEAST_N = 0.5
BASIS = (
    "clamp and what the bracket stands on are counted at values of common practice; what it stands "
    "on must itself be much stiffer than the bracket"
)


def with_installs(answer: Document, installs: Mapping[int, Sequence[Installation]]) -> Document:
    """The document of ``detune`` with ``install`` in every fix that has one."""
    fixes = [
        fix | ({"install": document(installs[fix["rank"]])} if fix["rank"] in installs else {})
        for fix in answer["fixes"]
    ]
    return answer | {"fixes": fixes}


def document(parts: Sequence[Installation]) -> Document:
    """The ``install`` of a fix; several parts under ``all_of``, in the order of its change."""
    if len(parts) == 1:
        return _one(parts[0])
    return {"all_of": [_one(part) for part in parts]}


def _one(found: Installation) -> Document:
    rest = found.at_rest
    return {
        "at_m": found.at_m,
        "stiffness_needed": _stiffness(found.stiffness_n_per_m),
        "kept_as_drawn": found.kept,
        "fails_below": _stiffness(found.fails_below_n_per_m),
        "fails_above": _stiffness(found.fails_above_n_per_m),
        "braced_to": "header" if found.to_header else "structure",
        "reach_m": found.reach_m,
        "brackets": [_bracket(bracket) for bracket in found.brackets],
        "added_load_n": found.added_load_n,
        "sag_mm": [1e3 * a.sag_m for a in (rest.before, rest.after)] if rest else None,
        "bending_stress_mpa": [1e-6 * a.bending_stress_pa for a in (rest.before, rest.after)]
        if rest
        else None,
        "span_rule": _rule(rest),
        "thermal_movement_mm": {axis: 1e3 * h.movement_m for axis, h in found.heat.items()},
        "thermal_force_n": {axis: h.force_n for axis, h in found.heat.items()},
        "held": [axis for axis, h in found.heat.items() if h.held],
        "cautions": list(found.cautions),
    }


def _stiffness(by_axis: Mapping[str, float] | None) -> Document | None:
    return {f"{axis}_n_per_m": value for axis, value in by_axis.items()} if by_axis else None


def _bracket(bracket: Bracket) -> Document:
    return {
        "form": bracket.form,
        "section": bracket.section,
        "standard": bracket.standard,
        "longest_m": bracket.longest_m,
        "length_m": bracket.at_m,
        "reaches": bracket.reaches,
        "mass_kg": bracket.mass_kg,
        "vertical_n_per_m": bracket.vertical_n_per_m,
        "lateral_n_per_m": bracket.lateral_n_per_m,
    }


def _rule(rest: AtRest | None) -> Document | None:
    if rest is None:
        return None
    return {
        "rule": rest.rule_after.rule,
        "kept": [rest.rule_before.kept, rest.rule_after.kept],
        "source": rest.rule_after.source,
    }


def lines(parts: Sequence[Installation], units: str, fold: Fold = paragraph) -> list[str]:
    """Stiffness, brackets, line at rest, heat and cautions."""
    found: list[str] = []
    for number, part in enumerate(parts, start=1):
        if len(parts) > 1:
            found.append(f"Part {number} of {len(parts)}")
        found += stiffness_lines(part, units, fold)
        found += bracket_lines(part, units, fold)
        found += heat_lines(part, units)
        found += rest_lines(part, units, fold)
    for caution in dict.fromkeys(text for part in parts for text in part.cautions):
        found += fold(caution, 2, "- ")
    return found


def stiffness_lines(found: Installation, units: str, fold: Fold = paragraph) -> list[str]:
    """What was promised for, and where the promise ends."""
    needed = found.stiffness_n_per_m
    if not needed:
        return ["No new stiffness is needed."]
    text = [f"Draw it {_shown(needed, units)}."]
    below, above = found.fails_below_n_per_m, found.fails_above_n_per_m
    if below is None:
        text.append(
            "How much less would do was not counted."
            if found.kept is None
            else "Even so drawn it does not reach the chance wanted, as installed."
        )
    elif not any(below.values()):
        text.append("Softer does no harm.")
    else:
        text.append(f"Drawn under {_shown(below, units)} the chance falls below the one wanted.")
    if above is not None:
        text.append(f"Over {_shown(above, units)} it does as well: no stiffer than that.")
    return fold(" ".join(text), 0, "")


def _shown(by_axis: Mapping[str, float], units: str) -> str:
    """Directions of one value told together."""
    together: dict[str, list[str]] = {}
    for axis, value in by_axis.items():
        together.setdefault(show(value, "stiffness", units, 2), []).append(axis)
    return ", ".join(f"{value} {' and '.join(axes)}" for value, axes in together.items())


def bracket_lines(found: Installation, units: str, fold: Fold = paragraph) -> list[str]:
    """The lightest bracket of each form, with its longest length."""
    if not found.stiffness_n_per_m:
        return []
    if not found.brackets:
        return fold(bracket_words(found, units), 0, "")
    return [
        *fold(bracket_words(found, units), 0, ""),
        *table(*bracket_cells(found, units)),
        *fold(sections_words(found), 2, ""),
    ]


def bracket_words(found: Installation, units: str) -> str:
    """What the brackets are for, or why there is none."""
    if found.brackets:
        reach = show(found.reach_m, "length", units, 2)
        what = "the header" if found.to_header else "steel or concrete"
        return f"Brackets that have it, the lightest of each form for {reach} to {what}:"
    if "axial" in found.stiffness_n_per_m:
        return "Brackets that hold along the pipe are not designed here."
    return (
        "No bracket of the table is stiff enough, clamp and base counted: share the stiffness "
        "between two supports, or design one."
    )


def bracket_cells(found: Installation, units: str) -> Cells:
    """The brackets that are stiff enough."""
    reach = show(found.reach_m, "length", units, 2)
    rows = [
        (
            bracket.form,
            bracket.section,
            show(bracket.longest_m, "length", units, 2),
            show(bracket.mass_kg, "mass", units, 2),
            "" if bracket.reaches else f"falls short of {reach}",
        )
        for bracket in found.brackets
    ]
    return Cells(("form", "section", "longest", "mass", ""), rows)


def sections_words(found: Installation) -> str:
    """The standards of the sections, and what else is counted in."""
    standards = ", ".join(dict.fromkeys(bracket.standard for bracket in found.brackets))
    return f"Sections: {standards}. {BASIS[0].upper()}{BASIS[1:]}."


def heat_lines(found: Installation, units: str) -> list[str]:
    """Free movement and force in each direction at the station."""
    if not found.heat:
        return []
    return [HEAT_TITLE, *table(*heat_cells(found, units))]


HEAT_TITLE = "From tapped to running, heat and pressure move the pipe here:"


def heat_cells(found: Installation, units: str) -> Cells:
    """Movement by heat and the force of holding it."""
    rows = [
        (axis, movement(heated, units), force(heated.force_n, units),
         "held" if heated.held else "free")
        for axis, heated in found.heat.items()
    ]  # fmt: skip
    return Cells(("direction", "free", "force if held", "by this"), rows)


def force(newtons: float, units: str) -> str:
    """A force to whole newtons or pounds."""
    return show(newtons if newtons >= _LEAST_N else 0.0, "force", units, 2)


def movement(heated: Heated, units: str) -> str:
    """A movement in millimetres or inches."""
    return small(heated.movement_m, units)


def small(length_m: float, units: str) -> str:
    """A small length in millimetres or inches."""
    rounded = round(length_m / 0.0254, 3) + 0.0 if units == "US" else round(1e3 * length_m, 2) + 0.0
    return f"{rounded:.3f} in" if units == "US" else f"{rounded:.2f} mm"


def rest_lines(found: Installation, units: str, fold: Fold = paragraph) -> list[str]:
    """Sag, bending and load under weight, before and after, beside the published rule."""
    text = []
    if found.added_load_n is not None:
        load = force(found.added_load_n, units)
        text.append(f"Weight it comes to carry: about {load}.")
    if found.at_rest is None:
        return fold(" ".join([*text, f"Sag: {found.rest_refused}."]), 0, "")
    before, after = found.at_rest.before, found.at_rest.after
    rule = found.at_rest.rule_after
    text.append(
        f"Under weight the line sags {small(before.sag_m, units)} before, "
        f"{small(after.sag_m, units)} after, and bends {stress(before, units)} before, "
        f"{stress(after, units)} after; the span rule, {rule.rule}, is "
        f"{'kept' if rule.kept else 'not kept'} ({rule.source})."
    )
    return fold(" ".join(text), 0, "")


def stress(answer: WeightAnswer, units: str) -> str:
    """A bending stress in MPa or psi."""
    if units == "US":
        return f"{answer.bending_stress_pa / 6894.757:.0f} psi"
    return f"{answer.bending_stress_pa / 1e6:.1f} MPa"
