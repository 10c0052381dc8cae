"""The job file, table by table: which keys there are and what each may hold.

Every quantity is read to SI on the way in, so that a wrong unit is found with its key.
"""

from __future__ import annotations

from typing import Annotated, Any

from pydantic import BaseModel, ConfigDict, Discriminator, PlainValidator, StringConstraints, Tag
from pydantic import Field as Limits

from fieldkit.job.readers import (
    direction,
    number_or_text,
    offset,
    one_of,
    order,
    pair,
    quantity,
    raw,
    stiffness,
    told,
    whole,
)
from fieldkit.signal.recording import DIRECTIONS, QUANTITIES
from fieldkit.span.layout import Stiffness, Vector
from fieldkit.span.supports import KINDS

FORMAT = 1
FAMILIES = ("support", "move", "stiffen", "mass", "speed", "absorber")
STATES = ("tapped", "running")

Text = Annotated[str, StringConstraints(max_length=200)]
Spoken = Annotated[str, PlainValidator(told(number_or_text))]
Raw = Annotated[Any, PlainValidator(told(raw))]
Length = Annotated[float, PlainValidator(told(quantity("length", high=1000.0)))]
Size = Annotated[float, PlainValidator(told(quantity("length", above=0.0, high=5.0)))]
RunLength = Annotated[float, PlainValidator(told(quantity("length", low=1e-3, high=1000.0)))]
Offset = Annotated[Vector, PlainValidator(told(offset))]
Mass = Annotated[float, PlainValidator(told(quantity("mass", high=1e5)))]
Density = Annotated[float, PlainValidator(told(quantity("density")))]
WallDensity = Annotated[float, PlainValidator(told(quantity("density", above=100.0)))]
Modulus = Annotated[float, PlainValidator(told(quantity("modulus")))]
Expansion = Annotated[float, PlainValidator(told(quantity("expansion")))]
Temperature = Annotated[float, PlainValidator(told(quantity("temperature")))]
Pressure = Annotated[float, PlainValidator(told(quantity("pressure")))]
Frequency = Annotated[float, PlainValidator(told(quantity("frequency", above=0.0, high=1e5)))]
Limit = Annotated[float, PlainValidator(told(quantity("frequency", above=0.0, high=5000.0)))]
Poisson = Annotated[float, PlainValidator(told(quantity("ratio", low=0.0, high=0.5)))]
Share = Annotated[float, PlainValidator(told(quantity("ratio", low=0.0, high=1.0)))]
Fraction = Annotated[float, PlainValidator(told(quantity("ratio", above=0.0, below=1.0)))]
Margin = Annotated[float, PlainValidator(told(quantity("ratio", low=0.0, below=1.0)))]
Range = tuple[float, float]
Fill = Annotated[Range, PlainValidator(told(pair(quantity("ratio", low=0.0, high=1.0))))]
SpeedRange = Annotated[Range, PlainValidator(told(pair(quantity("speed", high=4e3))))]
FrequencyRange = Annotated[Range, PlainValidator(told(pair(quantity("frequency", high=1e5))))]
Stations = Annotated[Range, PlainValidator(told(pair(quantity("length", high=1e4), both=True)))]
Held = Annotated[Stiffness, PlainValidator(told(stiffness("stiffness")))]
HeldRotation = Annotated[Stiffness, PlainValidator(told(stiffness("rotational_stiffness")))]
Heading = Annotated[Vector, PlainValidator(told(direction))]
Order = Annotated[float, PlainValidator(told(order))]
Channel = Annotated[int, PlainValidator(told(whole(1, 512)))]
Units = Annotated[str, PlainValidator(told(one_of("system of units", "SI", "US")))]
Kind = Annotated[str, PlainValidator(told(one_of("kind of support", *KINDS)))]
RecordingKind = Annotated[str, PlainValidator(told(one_of("kind of recording", "tap", "running")))]
StateName = Annotated[str, PlainValidator(told(one_of("state", *STATES)))]
QuantityName = Annotated[str, PlainValidator(told(one_of("measured quantity", *QUANTITIES)))]
DirectionName = Annotated[str, PlainValidator(told(one_of("direction", *DIRECTIONS)))]
Family = Annotated[str, PlainValidator(told(one_of("kind of change", *FAMILIES)))]


class Table(BaseModel):
    """A table of the file: no key beyond those listed, nothing converted silently."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class MaterialTable(Table):
    """``pipe.material`` where the name alone does not do."""

    elastic_modulus: Modulus
    density: WallDensity
    poisson: Poisson
    expansion: Expansion | None = None
    name: Text = "own material"


class InsulationTable(Table):
    """``pipe.insulation``."""

    thickness: Size
    density: Density


def _material_form(value: object) -> str:
    return "<table>" if isinstance(value, dict) else "<name>"


MaterialEntry = Annotated[
    Annotated[Text, Tag("<name>")] | Annotated[MaterialTable, Tag("<table>")],
    Discriminator(_material_form),
]


class PipeTable(Table):
    """``[pipe]``."""

    size: Spoken | None = None
    outside_diameter: Size | None = None
    schedule: Spoken | None = None
    wall: Size | None = None
    material: MaterialEntry
    insulation: InsulationTable | None = None


class ContentsTable(Table):
    """``[contents]``."""

    name: Text | None = None
    density: Density | None = None


class StateTable(Table):
    """``[state.tapped]`` or ``[state.running]``; None is left out."""

    fill: Fill | None = None
    temperature: Temperature | None = None
    pressure: Pressure | None = None


class StatesTable(Table):
    """``[state]``."""

    tapped: StateTable = StateTable()
    running: StateTable = StateTable()


class LegTable(Table):
    """``[[leg]]``."""

    direction: Heading
    length: RunLength
    bend_radius: RunLength | None = None


class HeaderTable(Table):
    """``support.header``: the pipe a branch is welded to."""

    size: Spoken | None = None
    outside_diameter: Size | None = None
    schedule: Spoken | None = None
    wall: Size | None = None


class SupportTable(Table):
    """``[[support]]``."""

    at: Length
    kind: Kind
    vertical: Held = "implied"
    lateral: Held = "implied"
    axial: Held = "implied"
    rotation: HeldRotation = "implied"
    x: Held = "implied"
    y: Held = "implied"
    z: Held = "implied"
    header: HeaderTable | None = None


class MassTable(Table):
    """``[[mass]]``."""

    name: Text = "mass"
    at: Length
    mass: Mass
    tolerance: Share = 0.1
    offset: Offset = (0.0, 0.0, 0.0)


class ExcitationTable(Table):
    """``[[excitation]]``."""

    name: Text | None = None
    speed: SpeedRange | None = None
    orders: Annotated[list[Order], Limits(min_length=1, max_length=50)] | None = None
    frequency: FrequencyRange | None = None


class HammerTable(Table):
    """``recording.hammer``: the channel with the force of the blows."""

    channel: Channel
    sensitivity: Raw = None
    full_scale: Raw = None
    scale: Raw = None
    at: Length | None = None


class RecordingTable(Table):
    """``[[recording]]``."""

    file: Annotated[Text, StringConstraints(min_length=1)]
    kind: RecordingKind
    state: StateName | None = None
    channel: Channel = 1
    quantity: QuantityName = "acceleration"
    sensitivity: Raw = None
    full_scale: Raw = None
    scale: Raw = None
    direction: DirectionName | None = None
    at: Length | None = None
    rate: Frequency | None = None
    hammer: HammerTable | None = None


class MeasuredTable(Table):
    """``[[measured]]``."""

    frequency: Frequency
    sd: Frequency | None = None
    damping: Fraction | None = None
    direction: DirectionName | None = None
    state: StateName = "tapped"
    at: Length | None = None


class GoalTable(Table):
    """``[goal]``."""

    margin: Margin = 0.2
    margin_measured: Margin = 0.1
    chance: Fraction = 0.9
    up_to: Limit = 200.0
    allow: Annotated[list[Family], Limits(min_length=1, max_length=20)] = list(FAMILIES)
    keep_out: Annotated[list[Stations], Limits(max_length=100)] = []
    steel: Annotated[list[Stations], Limits(max_length=100)] = []


class JobFile(Table):
    """The whole file."""

    fieldkit: Annotated[int, PlainValidator(told(whole(FORMAT, FORMAT)))]
    title: Text = ""
    units: Units = "SI"
    pipe: PipeTable
    contents: ContentsTable | None = None
    state: StatesTable = StatesTable()
    leg: Annotated[list[LegTable], Limits(min_length=1, max_length=200)]
    support: Annotated[list[SupportTable], Limits(min_length=1, max_length=200)]
    mass: Annotated[list[MassTable], Limits(max_length=200)] = []
    excitation: Annotated[list[ExcitationTable], Limits(max_length=50)] = []
    recording: Annotated[list[RecordingTable], Limits(max_length=200)] = []
    measured: Annotated[list[MeasuredTable], Limits(max_length=200)] = []
    goal: GoalTable = GoalTable()


def keys_of(table: tuple[str, ...]) -> tuple[str, ...]:
    """Known keys of a table, by its path without indexes; empty where there is no such table."""
    model = TABLES.get(table)
    return tuple(model.model_fields) if model else ()


TABLES: dict[tuple[str, ...], type[Table]] = {
    (): JobFile,
    ("pipe",): PipeTable,
    ("pipe", "material"): MaterialTable,
    ("pipe", "insulation"): InsulationTable,
    ("contents",): ContentsTable,
    ("state",): StatesTable,
    ("state", "tapped"): StateTable,
    ("state", "running"): StateTable,
    ("leg",): LegTable,
    ("support",): SupportTable,
    ("support", "header"): HeaderTable,
    ("mass",): MassTable,
    ("excitation",): ExcitationTable,
    ("recording",): RecordingTable,
    ("recording", "hammer"): HammerTable,
    ("measured",): MeasuredTable,
    ("goal",): GoalTable,
}
REPEATED = ("leg", "support", "mass", "excitation", "recording", "measured")
"""Tables written with two brackets."""
