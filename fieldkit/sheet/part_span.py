"""The span as it was described: drawn to scale, pipe, legs, supports, masses, states."""

from __future__ import annotations

import math
from itertools import zip_longest

from fieldkit.detune.fixes import Change, SetMass, StiffenSupport
from fieldkit.detune.push import parts
from fieldkit.quantity import show
from fieldkit.sheet.beyond import Results
from fieldkit.sheet.content import Block, Paragraph, Section, Table, section
from fieldkit.sheet.figure_span import span_figure
from fieldkit.span.layout import Believed, Span, State
from fieldkit.span.line import line_of
from fieldkit.span.supports import RIGID_N_PER_M, Spring, springs

FIVE_PERCENT = 1.645
"""Standard deviations from the median to 5 and 95 %."""


def span(found: Results) -> Section:
    """Everything the models stand on."""
    job = found.work.job
    blocks: list[Block] = [span_figure(job, change_stations(found))]
    blocks += [_pipe(found), _states(found), _legs(job.span, job.units), _supports(found)]
    blocks.append(_masses(found))
    return section("The span", blocks)


def change_stations(found: Results) -> tuple[float, ...]:
    """Where the first change goes."""
    detuning = found.work.detuning
    if detuning is None or not detuning.fixes:
        return ()
    of = found.work.job.span
    stations = [_station(of, part) for part in parts(detuning.fixes[0].change)]
    return tuple(station for station in stations if station is not None)


def _station(of: Span, change: Change) -> float | None:
    if isinstance(change, StiffenSupport):
        return of.supports[change.index].at_m
    if isinstance(change, SetMass):
        return of.masses[change.index].at_m
    for name in ("to_m", "at_m"):
        at_m = getattr(change, name, None)
        if isinstance(at_m, float | int):
            return float(at_m)
    return None


def _pipe(found: Results) -> Table:
    job = found.work.job
    pipe, material, units = job.span.pipe, job.span.material, job.units
    layer = job.span.insulation
    line = line_of(job.span, job.tapped)
    rows = [
        ("size", pipe.label or "as measured"),
        ("outside diameter D", show(pipe.outside_diameter_m, "length", units, 5)),
        ("wall t", show(pipe.wall_m, "length", units, 4)),
        ("bore d = D - 2t", show(pipe.bore_m, "length", units, 5)),
        ("metal area, pi/4 (D² - d²)", f"{1e6 * pipe.wall_area_m2:.5g} mm²"),
        ("second moment I, pi/64 (D⁴ - d⁴)", f"{1e8 * pipe.second_moment_m4:.5g} cm⁴"),
        ("material", material.name),
        ("density", show(material.density_kg_per_m3, "density", units)),
        ("Poisson's ratio", f"{material.poisson:g}"),
        ("expansion", show(material.expansion_per_k, "expansion", units)),
        ("insulation", f"{show(layer.thickness_m, 'length', units)} thick, "
         f"{show(layer.density_kg_per_m3, 'density', units)}" if layer else "none"),
        ("mass of pipe and insulation", f"{line.own_mass_kg_per_m:.4g} kg/m"),
        ("mass of contents, bore full", f"{line.contents_kg_per_m:.4g} kg/m"),
        ("contents", _contents(found)),
        ("length of the span", show(job.span.length_m, "length", units)),
    ]  # fmt: skip
    half = -(-len(rows) // 2)
    pairs = zip_longest(rows[:half], rows[half:], fillvalue=("", ""))
    beside = tuple((*left, *right) for left, right in pairs)
    return Table("Pipe", ("property", "value", "property", "value"), beside, keyed=True)


def _contents(found: Results) -> str:
    job = found.work.job
    density = job.span.contents_density_kg_per_m3
    if not density:
        return "none"
    return f"{job.contents_name or 'unnamed'}, {show(density, 'density', job.units)}"


def _states(found: Results) -> Table:
    job = found.work.job
    rows = tuple(_state(found, state) for state in (job.tapped, job.running))
    head = ("state", "fill of the bore", "temperature", "pressure", "modulus E", "E I", "mass")
    return Table("States", head, rows, keyed=True)


def _state(found: Results, state: State) -> tuple[str, ...]:
    job = found.work.job
    line = line_of(job.span, state)
    low, high = state.fill
    fill = f"{100 * low:.0f} %" if low == high else f"{100 * low:.0f} to {100 * high:.0f} %"
    mass = line.own_mass_kg_per_m + state.nominal_fill * line.contents_kg_per_m
    return (
        state.name,
        fill,
        show(state.temperature_k, "temperature", job.units),
        show(state.pressure_pa, "pressure", job.units),
        show(job.span.material.modulus_at(state.temperature_k), "modulus", job.units),
        f"{line.bending_n_m2 / 1e3:.5g} kN m²",
        f"{mass:.4g} kg/m",
    )


def _legs(of: Span, units: str) -> Table:
    rows = []
    start = 0.0
    for i, leg in enumerate(of.legs, start=1):
        end = start + leg.length_m
        radius = leg.bend_radius_m
        rows.append(
            (
                str(i),
                "({:g}, {:g}, {:g})".format(*(round(part, 4) for part in leg.direction)),
                show(leg.length_m, "length", units),
                f"{show(start, 'length', units)} to {show(end, 'length', units)}",
                "-" if radius is None else show(radius, "length", units),
            )
        )
        start = end
    head = ("leg", "direction (x, y, z)", "length", "stations", "bend radius before it")
    return Table("Legs, corner to corner", head, tuple(rows))


def _supports(found: Results) -> Block:
    job = found.work.job
    if not job.span.supports:
        return Paragraph("No support is described: add one, or no frequency can be believed.")
    rows = []
    for spring in springs(job.span):
        support = job.span.supports[spring.support]
        rows.append(
            (
                f"S{spring.support + 1}",
                show(support.at_m, "length", job.units),
                support.kind,
                spring.axis,
                _stiffness(spring, spring.stiffness, job.units),
                _interval(spring, job.units),
                _origin(found, spring),
            )
        )
    for i, support in enumerate(job.span.supports, start=1):
        if not any(spring.support == i - 1 for spring in springs(job.span)):
            at = show(support.at_m, "length", job.units)
            rows.insert(i - 1, (f"S{i}", at, support.kind, "none", "free", "-", "stated"))
    title = "Supports: stiffness before the match (what the tap made of it: see Match)"
    head = ("", "at", "kind", "direction", "stiffness", "5 to 95 %", "where from")
    return Table(title, head, tuple(rows))


def _stiffness(spring: Spring, value: float, units: str) -> str:
    turning = spring.axis in ("rotation", "torsion")
    if not turning and value >= RIGID_N_PER_M:
        return "rigid"
    return show(value, "rotational_stiffness" if turning else "stiffness", units, 3)


def _interval(spring: Spring, units: str) -> str:
    if not spring.sd_ln:
        return "taken as known"
    factor = math.exp(FIVE_PERCENT * spring.sd_ln)
    low, high = spring.stiffness / factor, spring.stiffness * factor
    return f"{_stiffness(spring, low, units)} to {_stiffness(spring, high, units)}"


def _origin(found: Results, spring: Spring) -> str:
    stated = getattr(found.work.job.span.supports[spring.support], spring.axis)
    if isinstance(stated, Believed):
        return "carried over in the job file"
    if stated == "unknown":
        return "unknown in the job file: its kind, doubt widened"
    if stated == "implied":
        return "assumed from its kind"
    return "stated in the job file"


def _masses(found: Results) -> Block:
    job = found.work.job
    if not job.span.masses:
        return Paragraph("No valve, flange or other mass is described.")
    rows = tuple(
        (
            f"M{i}",
            mass.name,
            show(mass.at_m, "length", job.units),
            show(mass.mass_kg, "mass", job.units),
            f"{100 * mass.tolerance:g} %",
            ", ".join(show(part, "length", job.units, 3) for part in mass.offset_m)
            if any(mass.offset_m)
            else "on the centre line",
        )
        for i, mass in enumerate(job.span.masses, start=1)
    )
    head = ("", "name", "at", "mass", "sd", "centre of gravity off the pipe (x, y, z)")
    return Table("Masses", head, rows)
