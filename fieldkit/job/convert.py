"""From the tables of the file to the values the rest of the program works with."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

from fieldkit.detune.excitation import Excitation, Goal
from fieldkit.errors import InputError
from fieldkit.job.document import Job, unnamed_excitation
from fieldkit.job.file_model import (
    ExcitationTable,
    GoalTable,
    HeaderTable,
    JobFile,
    LegTable,
    MassTable,
    MaterialTable,
    PipeTable,
    StateTable,
    SupportTable,
)
from fieldkit.job.measurements import measured_mode, recording_entry
from fieldkit.job.readers import bad
from fieldkit.job.restraint import support_from
from fieldkit.span.header import check_header
from fieldkit.span.layout import Insulation, Leg, PointMass, Span, State, Support
from fieldkit.span.materials import Material, contents_density, material
from fieldkit.span.pipes import PipeSection, known_schedules, standard_pipe

INCH_M = 0.0254
STEEL_EXPANSION_PER_K = 11.7e-6
"""Where a material is given by its numbers without one."""
ROOM_K = 293.15


def build_job(file: JobFile, path: Path | None) -> Job:
    """The job of a file that fits the schema.

    Raises InputError, its place holding the key only, where values contradict each other.
    """
    span = _span(file)
    tapped = _state("tapped", file.state.tapped, State("tapped"))
    running = _state("running", file.state.running, tapped)
    for state, table in ((tapped, file.state.tapped), (running, file.state.running)):
        _check_state(state, table, span, has_contents=file.contents is not None)
    return Job(
        title=file.title,
        units=file.units,
        span=span,
        tapped=tapped,
        running=running,
        excitations=tuple(_excitation(table, i) for i, table in enumerate(file.excitation)),
        recordings=tuple(
            recording_entry(table, i, span, path) for i, table in enumerate(file.recording)
        ),
        measured=tuple(measured_mode(table, i, span) for i, table in enumerate(file.measured)),
        goal=_goal(file.goal, span),
        contents_name=(file.contents.name or "") if file.contents else "",
        path=path,
    )


def _span(file: JobFile) -> Span:
    section = _section(file.pipe)
    legs = tuple(_leg(table, i, section) for i, table in enumerate(file.leg))
    layer = file.pipe.insulation
    bare = Span(section, _material(file.pipe), legs)
    return Span(
        pipe=section,
        material=bare.material,
        legs=legs,
        supports=tuple(_support(table, i, bare) for i, table in enumerate(file.support)),
        masses=tuple(_mass(table) for table in file.mass),
        contents_density_kg_per_m3=_density(file),
        insulation=Insulation(layer.thickness, layer.density) if layer else None,
    )


def _support(table: SupportTable, index: int, span: Span) -> Support:
    support, given = support_from(table, index, span), table.header
    if given is None:
        return support
    where = f"support[{index}].header"
    if table.kind != "branch":
        what = f"a support of the kind {table.kind} stands on no header"
        raise bad(where, what, 'write kind = "branch", or take header out')
    try:
        header = _section(given, where)
        check_header(header, span.pipe)
    except InputError as error:
        raise bad(_moved(error.place.field or where, where), error.what, error.remedy) from None
    return replace(support, header=header)


def _moved(field: str, where: str) -> str:
    """The place of a fault that a reader of pipes names as one of ``pipe``."""
    return f"{where}.{field.removeprefix('pipe.')}" if field.startswith("pipe.") else field


def _section(pipe: PipeTable | HeaderTable, where: str = "pipe") -> PipeSection:
    size, measured = pipe.size, pipe.outside_diameter
    if (size is None) == (measured is None):
        what = "it has both size and outside_diameter" if size else "its size is missing"
        raise bad(f"{where}.size", what, 'write size = "NPS 3", or outside_diameter = "88.9 mm"')
    if (pipe.schedule is None) == (pipe.wall is None):
        what = "it has both schedule and wall" if pipe.wall else "its wall is missing"
        raise bad(f"{where}.schedule", what, 'write schedule = "40", or wall = "5.49 mm"')
    if size is not None and pipe.schedule is not None:
        return standard_pipe(size, pipe.schedule)
    if pipe.wall is None:
        what = "a schedule belongs to a standard size, not to an outside_diameter"
        raise bad(f"{where}.schedule", what, 'write wall = "5.49 mm"')
    if size is None:
        diameter_m = measured or 0.0
        return PipeSection(diameter_m, pipe.wall, f"OD {diameter_m * 1e3:g} mm")
    standard = standard_pipe(size, known_schedules(size)[0])
    nominal = standard.label.partition(" schedule")[0]
    return PipeSection(
        standard.outside_diameter_m, pipe.wall, f"{nominal} wall {pipe.wall * 1e3:g} mm"
    )


def long_radius_m(section: PipeSection) -> float:
    """Long-radius bend: 1.5 times the nominal size in inches, or the measured diameter."""
    if not section.label.startswith("NPS "):
        return 1.5 * section.outside_diameter_m
    nominal = sum(Fraction(part) for part in section.label.split()[1].split("-"))
    radius_m = 1.5 * float(nominal) * INCH_M
    return (
        radius_m if radius_m > section.outside_diameter_m / 2 else 1.5 * section.outside_diameter_m
    )


def _leg(table: LegTable, index: int, section: PipeSection) -> Leg:
    if index > 0:
        radius_m = table.bend_radius or long_radius_m(section)
        return Leg(table.direction, table.length, radius_m)
    if table.bend_radius is not None:
        what = "the first leg has no bend before it"
        raise bad("leg[0].bend_radius", what, "move bend_radius to the leg behind the bend")
    return Leg(table.direction, table.length)


def _material(pipe: PipeTable) -> Material:
    given = pipe.material
    if not isinstance(given, MaterialTable):
        return material(given)
    expansion = STEEL_EXPANSION_PER_K if given.expansion is None else given.expansion
    modulus = ((ROOM_K, given.elastic_modulus),)
    return Material(given.name, given.density, given.poisson, modulus, expansion)


def _density(file: JobFile) -> float:
    contents = file.contents
    if contents is None:
        return 0.0
    if contents.density is not None:
        return contents.density
    if contents.name is None:
        what = "[contents] names nothing"
        raise bad("contents", what, 'write name = "water", or density = "998 kg/m^3"')
    return contents_density(contents.name)


def _mass(table: MassTable) -> PointMass:
    return PointMass(table.at, table.mass, table.name, table.tolerance, table.offset)


def _state(name: str, table: StateTable, other: State) -> State:
    """The state, what is left out being as in the other."""
    return State(
        name,
        other.fill if table.fill is None else table.fill,
        other.temperature_k if table.temperature is None else table.temperature,
        other.pressure_pa if table.pressure is None else table.pressure,
    )


def _check_state(state: State, table: StateTable, span: Span, *, has_contents: bool) -> None:
    if table.fill is not None and table.fill[1] > 0 and not has_contents:
        what = "it says the pipe is filled, and the job names no contents"
        raise bad(f"state.{state.name}.fill", what, 'add [contents] with name = "water"')
    try:
        span.material.modulus_at(state.temperature_k)
    except InputError as error:
        raise bad(f"state.{state.name}.temperature", error.what, error.remedy) from None


def _excitation(table: ExcitationTable, index: int) -> Excitation:
    where = f"excitation[{index}]"
    name = table.name or unnamed_excitation(index)
    if (table.speed is None) == (table.frequency is None):
        what = "it has both speed and frequency" if table.speed else "its speed is missing"
        remedy = 'write speed = "1480 rpm" with orders, or frequency = "100 Hz"'
        raise bad(f"{where}.frequency" if table.speed else where, what, remedy)
    given = table.speed or table.frequency or (0.0, 0.0)
    if given[1] <= 0:
        key = "speed" if table.speed else "frequency"
        raise bad(f"{where}.{key}", "a machine at rest excites nothing", "write it above zero")
    if table.frequency is not None and table.orders is not None:
        what = "orders belong to a speed, not to a frequency"
        raise bad(f"{where}.orders", what, "leave orders out, or give a speed")
    orders = tuple(table.orders) if table.orders else (1.0,)
    return Excitation(name, table.speed, orders, table.frequency)


def _goal(table: GoalTable, span: Span) -> Goal:
    for key, stretches in (("keep_out", table.keep_out), ("steel", table.steel)):
        for i, (low_m, _) in enumerate(stretches):
            if low_m > span.length_m:
                what = f"this stretch begins beyond the end of the span at {span.length_m:g} m"
                raise bad(f"goal.{key}[{i}]", what, "correct the stations")
    return Goal(
        margin=table.margin,
        margin_measured=table.margin_measured,
        chance=table.chance,
        up_to_hz=table.up_to,
        allow=tuple(dict.fromkeys(table.allow)),
        keep_out_m=tuple(table.keep_out),
        steel_m=tuple(table.steel),
    )
