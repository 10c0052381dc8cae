"""The tables of a job file as forms: keys, labels and how each is typed."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

from fieldkit.span.supports import KINDS
from fieldkit.ui.forms import offers
from fieldkit.ui.forms.codecs import (
    Choice,
    Codec,
    Direction,
    Number,
    Quantity,
    Range,
    Several,
    Words,
)
from fieldkit.ui.forms.named import MaterialName, PipeSize, Schedule
from fieldkit.ui.forms.offers import Offer, OffersOf, fixed

LENGTH = Quantity("length")
SPEED = Quantity("speed")
FREQUENCY = Quantity("frequency")
SENSITIVITY = Quantity("sensitivity")
FORCE_SENSITIVITY = Quantity("force_sensitivity")
VOLTAGE = Quantity("voltage")
STIFFNESS = Quantity("stiffness", ("rigid", "free", "unknown"))
TURNING = Quantity("rotational_stiffness", ("rigid", "free", "unknown"))
SHARE = Number(0.0, 1.0)
STATE = Choice(("tapped", "running"))
DIRECTION_OF_MOTION = Choice(("vertical", "lateral", "axial", "x", "y", "z"))
SUPPORT_KINDS = tuple(KINDS)
UNITS = fixed(Offer("SI", "m, mm, kg, N/m"), Offer("US", "ft, in, lb, kip/in"))
RECORDING_KINDS = fixed(Offer("tap", "blows on the pipe"), Offer("running", "the machine runs"))
QUANTITIES = fixed(
    Offer("acceleration"),
    Offer("velocity"),
    Offer("displacement"),
    Offer("pressure", "a microphone"),
)


@dataclass(frozen=True)
class Field:
    """One key of a table."""

    key: str
    """Dotted where the file nests it: ``insulation.thickness``."""
    label: str
    codec: Codec
    needed: bool = False
    when_empty: str = ""
    """What leaving it out means."""
    said: str | None = None
    """Word before the value in a list; None takes the label, empty is for what needs none."""
    offers: OffersOf | None = None
    """What there is to choose from."""
    implied: Callable[[Mapping[str, str]], str] | None = None
    """What it means when it is empty, as far as the other fields say."""


@dataclass(frozen=True)
class Form:
    """One table of the job file."""

    table: str
    """``leg``, ``state.running``; empty for the top of the file."""
    title: str
    fields: tuple[Field, ...]
    repeated: bool = False

    def place(self, key: str) -> tuple[str, ...]:
        """Key path of a field, without the number of the row."""
        return tuple(part for part in f"{self.table}.{key}".split(".") if part)

    def field(self, key: str) -> Field:
        """The field of a key."""
        return next(field for field in self.fields if field.key == key)


def _state(name: str, left_out: str) -> Form:
    return Form(
        f"state.{name}",
        name.capitalize(),
        (
            Field("fill", "fill", Range(SHARE), when_empty=left_out),
            Field("temperature", "temperature", Quantity("temperature"), when_empty=left_out),
            Field("pressure", "pressure", Quantity("pressure"), when_empty=left_out),
        ),
    )


FORMS: dict[str, Form] = {
    form.table: form
    for form in (
        Form(
            "",
            "Job",
            (
                Field("title", "title", Words(), needed=True, said=""),
                Field("units", "units shown", Choice(("SI", "US")), when_empty="SI",
                      offers=UNITS),
            ),
        ),
        Form(
            "pipe",
            "Pipe",
            (
                Field("size", "size", PipeSize(), when_empty="by diameter", said="",
                      offers=offers.sizes),
                Field("schedule", "schedule", Schedule(), when_empty="by wall",
                      offers=offers.schedules()),
                Field("outside_diameter", "outside diam.", LENGTH, when_empty="by size"),
                Field("wall", "wall", LENGTH, when_empty="by schedule"),
                Field("material", "material", MaterialName(), when_empty="own", said="",
                      offers=offers.materials),
                Field("insulation.thickness", "insulation", LENGTH, when_empty="bare pipe"),
                Field("insulation.density", "its density", Quantity("density")),
            ),
        ),
        Form(
            "contents",
            "Contents",
            (
                Field("name", "name", Words("water"), when_empty="by density", said="",
                      offers=offers.contents),
                Field("density", "density", Quantity("density"), when_empty="by name"),
            ),
        ),
        _state("tapped", "full, 20 degC, no pressure"),
        _state("running", "as tapped"),
        Form(
            "leg",
            "Leg",
            (
                Field("direction", "direction", Direction(), needed=True, said="",
                      offers=offers.HEADINGS),
                Field("length", "length", LENGTH, needed=True, said=""),
                Field("bend_radius", "bend radius", LENGTH, when_empty="long radius, 1.5 x size"),
            ),
            repeated=True,
        ),
        Form(
            "support",
            "Support",
            (
                Field("at", "station", LENGTH, needed=True, said="at"),
                Field("kind", "kind", Choice(SUPPORT_KINDS), needed=True, said="",
                      offers=offers.support_kinds),
                Field("vertical", "vertical", STIFFNESS, when_empty="what the kind implies",
                      offers=offers.STIFFNESSES),
                Field("lateral", "lateral", STIFFNESS, when_empty="what the kind implies",
                      offers=offers.STIFFNESSES),
                Field("axial", "axial", STIFFNESS, when_empty="what the kind implies",
                      offers=offers.STIFFNESSES),
                Field("rotation", "rotation", TURNING, when_empty="what the kind implies",
                      offers=offers.STIFFNESSES),
                Field("header.size", "header size", PipeSize(), when_empty="no branch",
                      said="on header", offers=offers.sizes),
                Field("header.schedule", "its schedule", Schedule(), when_empty="no branch",
                      offers=offers.schedules("header.size")),
            ),
            repeated=True,
        ),
        Form(
            "mass",
            "Mass",
            (
                Field("name", "name", Words("check valve"), when_empty="mass", said="",
                      offers=offers.MASS_NAMES),
                Field("at", "station", LENGTH, needed=True, said="at"),
                Field("mass", "mass", Quantity("mass"), needed=True, said=""),
                Field("tolerance", "tolerance", SHARE, when_empty="10 %, one standard deviation",
                      offers=offers.TOLERANCES),
                Field(
                    "offset",
                    "offset x, y, z",
                    Several(Quantity("offset"), exactly=3),
                    when_empty="on the centre line",
                ),
            ),
            repeated=True,
        ),
        Form(
            "excitation",
            "Excitation",
            (
                Field("name", "name", Words("pump"), needed=True, said=""),
                Field("speed", "speed", Range(SPEED), when_empty="by frequency", said=""),
                Field("orders", "orders", Several(Number(0.01, 1000.0)), when_empty="1"),
                Field("frequency", "frequency", Range(FREQUENCY), when_empty="by speed", said=""),
            ),
            repeated=True,
        ),
        Form(
            "recording",
            "Recording",
            (
                Field("file", "file", Words("as beside the job file"), needed=True, said=""),
                Field("kind", "kind", Choice(("tap", "running")), needed=True, said="",
                      offers=RECORDING_KINDS),
                Field("state", "state", STATE, when_empty="as its kind says",
                      offers=offers.STATES),
                Field("channel", "channel", Number(1, 256, whole=True), when_empty="1"),
                Field("quantity", "quantity",
                      Choice(("acceleration", "velocity", "displacement", "pressure")),
                      when_empty="acceleration", offers=QUANTITIES),
                Field("sensitivity", "sensitivity", SENSITIVITY, when_empty="uncalibrated"),
                Field("full_scale", "full scale", VOLTAGE, when_empty="of the recorder"),
                Field("scale", "scale", Words("9.81 m/s^2 per unit"), when_empty="by sensitivity"),
                Field("direction", "direction", DIRECTION_OF_MOTION, when_empty="nobody said",
                      offers=offers.MOTIONS),
                Field("at", "station", LENGTH, when_empty="nobody said"),
                Field("rate", "rate", FREQUENCY, when_empty="as the file says"),
                Field("hammer.channel", "hammer channel", Number(1, 256, whole=True),
                      when_empty="no hammer", said="hammer on"),
                Field("hammer.sensitivity", "its sensitivity", FORCE_SENSITIVITY,
                      when_empty="uncalibrated"),
                Field("hammer.full_scale", "its full scale", VOLTAGE,
                      when_empty="of the recorder"),
                Field("hammer.scale", "its scale", Words("434 N per unit"),
                      when_empty="by sensitivity"),
                Field("hammer.at", "its station", LENGTH, when_empty="nobody said"),
            ),
            repeated=True,
        ),
        Form(
            "measured",
            "Peak",
            (
                Field("frequency", "frequency", FREQUENCY, needed=True, said=""),
                Field("sd", "its sd", FREQUENCY),
                Field("damping", "damping ratio", Number(0.0, 1.0)),
                Field("direction", "direction", DIRECTION_OF_MOTION, when_empty="nobody said",
                      offers=offers.MOTIONS),
                Field("state", "state", STATE, when_empty="tapped", offers=offers.STATES),
                Field("at", "station", LENGTH, when_empty="nobody said"),
            ),
            repeated=True,
        ),
        Form(
            "goal",
            "Goal",
            (
                Field("margin", "margin", Number(0.0, 0.9), when_empty="0.2"),
                Field("margin_measured", "margin measured", Number(0.0, 0.9), when_empty="0.1"),
                Field("chance", "chance wanted", SHARE, when_empty="0.9"),
                Field("up_to", "up to", FREQUENCY, when_empty="200 Hz"),
                Field("allow", "allow",
                      Several(Choice(
                          ("support", "move", "stiffen", "mass", "speed", "absorber"))),
                      when_empty="all of them"),
                Field("keep_out", "keep out", Several(Range(LENGTH), joint="; "),
                      when_empty="nowhere"),
                Field("steel", "steel near", Several(Range(LENGTH), joint="; "),
                      when_empty="not said"),
            ),
        ),
    )
}  # fmt: skip

ORDER_OF_ROWS = (
    "", "pipe", "contents", "state.tapped", "state.running",
    "leg", "support", "mass", "excitation", "goal", "recording", "measured",
)  # fmt: skip
"""The tables that the Span view lists."""
