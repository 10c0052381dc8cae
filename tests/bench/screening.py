"""How fast and how true changes are screened: ``python -m tests.bench.screening``.

Processor time, medians of a few rounds. An *answer* is one change on one member of the ensemble.
The same answers are had from scikit-fem, a general-purpose library, one model at a time, in turn.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from fieldkit.detune import judge
from fieldkit.detune.candidates import Search, generate
from fieldkit.detune.chance_map import chance_map
from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.detune.fixes import AddSupport
from fieldkit.detune.lowrank import condensed, kept_modes
from fieldkit.detune.rank import prepare
from fieldkit.detune.unknowns import member_span, station_map
from fieldkit.progress import Progress
from fieldkit.span.layout import Leg, Span, State, Support
from fieldkit.span.materials import material
from fieldkit.span.pipes import standard_pipe
from fieldkit.span.supports import springs
from tests.bench.asking import parser
from tests.bench.measuring import Real, in_turn, ratio
from tests.bench.rows import Row, lines, table
from tests.reference.dynamic_stiffness import Attachment, Beam
from tests.reference.hermite_beam import natural_frequencies_hz

MEMBERS = 200
STATIONS, LEVELS = 60, 40
RE_SOLVED = 24
UP_TO_HZ = 25.0
EMPTY = State("running")


LIBRARY = "a model for each by scikit-fem"


@dataclass(frozen=True)
class Errors:
    """Largest relative differences of the frequencies, all modes up to the limit."""

    library: float
    """From scikit-fem, slender pipe."""
    anew: float
    """From our own model built anew with the change in it."""
    anew_median: float


def line() -> Span:
    """A slender straight line, so that the library's slender beam is its equal."""
    return Span(
        standard_pipe("NPS 1/2", "40"),
        material("carbon steel"),
        (Leg((1.0, 0.0, 0.0), 8.0),),
        (Support(0.0, "clamp"), Support(3.0, "u-bolt"), Support(8.0, "clamp")),
    )


def searching() -> Search:
    """Two hundred members of the line, the first at the prior medians, shaken at three orders."""
    pump = (Excitation("pump", (2.4, 2.6), (1.0, 2.0, 4.0)),)
    goal = Goal(up_to_hz=UP_TO_HZ)
    search, _ = prepare(line(), EMPTY, EMPTY, None, pump, goal)
    z = search.field.z[:MEMBERS].copy()
    z[0] = 0.0
    some = replace(search.field, z=z, modes=search.field.model.modes(z), central=0)
    scatter = replace(
        search.scatter,
        stiffness_factor=search.scatter.stiffness_factor[:MEMBERS],
        place_m=np.zeros(MEMBERS),
        as_drawn=None,
    )
    return replace(search, field=some, scatter=scatter)


def rows(runs: int) -> list[Row]:
    """Answers a second, counted and solved, beside scikit-fem's, and how many a search counts."""
    search = searching()
    levels, places = search.stiffness_levels(LEVELS), search.attachable()[::4]
    some = [(at, k) for at in places for k in levels[::9]][:RE_SOLVED]
    spent_s = in_turn(
        {
            "counted": lambda: chance_map(search, "support", "vertical", STATIONS, LEVELS),
            "solved": lambda: [_solved(search, at_m, levels) for at_m in places],
            "library": lambda: [_by_library(search, at, k) for at, k in some],
        },
        runs,
    )
    answers = {
        "counted": STATIONS * LEVELS * MEMBERS,
        "solved": len(places) * len(levels) * MEMBERS,
        "library": len(some),
    }
    per_s = {name: answers[name] / seconds for name, seconds in spent_s.items()}
    apart = errors(search, some)
    tried = f"a search tries {len(generate(search, Progress())):,} single changes"
    true = f"frequencies within {100 * apart.library:.2g} % of it"
    return [
        _rate("fixes judged: bands clear, counted", per_s, "counted", tried),
        _rate("fixes judged: every frequency solved", per_s, "solved", true),
    ]


def _rate(name: str, per_s: Mapping[str, Real], way: str, note: str) -> Row:
    ours, theirs = per_s[way], per_s["library"]
    medians = float(np.median(ours)), float(np.median(theirs))
    return Row(name, *medians, ratio(ours, theirs), LIBRARY, "a second of processor", note)


def errors(search: Search, some: list[tuple[float, float]]) -> Errors:
    """Of the quick answers, over the changes (station, stiffness) given."""
    quick = [_quick(search, at, k) for at, k in some]
    library = [_by_library(search, at, k) for at, k in some]
    anew = [_anew(search, at, k) for at, k in some]
    from_anew = [_apart(own, exact) for own, exact in zip(quick, anew, strict=True)]
    return Errors(
        max(_apart(own, exact) for own, exact in zip(quick, library, strict=True)),
        max(from_anew),
        float(np.median(from_anew)),
    )


def _solved(search: Search, at_m: float, levels: np.ndarray) -> np.ndarray:
    """(levels, members, q) eigenvalues with a support at a station, every size at once."""
    push = search.push(AddSupport(at_m, vertical_n_per_m=1.0))
    base = search.field.modes
    seen = condensed(base, push.rows, push.residual, kept_modes(base, UP_TO_HZ))
    return seen.eigenvalues(levels[:, None, None] * search.scatter.stiffness_factor[:, None])


def _quick(search: Search, at_m: float, k: float) -> np.ndarray:
    values = _solved(search, at_m, np.array([k / search.scatter.stiffness_factor[0]]))[0, 0]
    return np.sqrt(np.maximum(values, 0)) / (2 * np.pi)


def _by_library(search: Search, at_m: float, k: float) -> np.ndarray:
    """The same change on the first member: every spring, length and wall its own."""
    member = member_span(search.span, search.field.model.unknowns, search.field.z[0])
    modulus = member.material.modulus_at(EMPTY.temperature_k)
    pipe = member.pipe
    beam = Beam(modulus * pipe.second_moment_m4, pipe.wall_area_m2 * 7850.0)
    moved = station_map(search.span, search.field.model.unknowns, search.field.z[0])
    attached = [Attachment(at, k, turning) for at, k, turning in held(member)]
    attached.append(Attachment(moved(at_m), k))
    hertz = natural_frequencies_hz(beam, member.length_m, attached, 12)
    return np.asarray(hertz[hertz < UP_TO_HZ])


def held(member: Span) -> list[tuple[float, float, float]]:
    """(station, vertical stiffness, stiffness against turning) of each support of a member."""
    every = springs(member)
    found = []
    for index, support in enumerate(member.supports):
        own = {s.axis: s.stiffness for s in every if s.support == index}
        found.append((support.at_m, own.get("vertical", 0.0), own.get("rotation", 0.0)))
    return found


def _anew(search: Search, at_m: float, k: float) -> np.ndarray:
    first = replace(search.field, central=0)
    change = AddSupport(at_m, vertical_n_per_m=k)
    found = judge.resolve(first, search.span, EMPTY, change, UP_TO_HZ)
    return np.asarray(found)


def _apart(own: np.ndarray, exact: np.ndarray) -> float:
    """Largest relative distance of an exact frequency from the nearest of ours."""
    return float(np.abs(own[None, :] / exact[:, None] - 1).min(axis=1).max())


def main() -> None:
    """Print the table, and how far the quick answers are off."""
    args = parser("tests.bench.screening", __doc__, "runs").parse_args()
    print(table(lines("fixes", rows(args.runs), busy=False)))
    search = searching()
    levels, places = search.stiffness_levels(LEVELS), search.attachable()[::4]
    apart = errors(search, [(at, k) for at in places for k in levels[::9]][:RE_SOLVED])
    print(
        f"\nerror against scikit-fem {100 * apart.library:.4f} %, against our model built anew "
        f"{100 * apart.anew:.4f} %, median {100 * apart.anew_median:.4f} %"
    )


if __name__ == "__main__":
    main()
