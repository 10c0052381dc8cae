"""The steps that describe a new pipe: what is asked, and what there is to choose."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from fieldkit.errors import FieldkitError, InputError
from fieldkit.job.draft import FILLS, Draft, job_of, orders_of
from fieldkit.job.machines import FIXED, MACHINES
from fieldkit.quantity import parse, quoted, show
from fieldkit.ui.forms import offers
from fieldkit.ui.forms.codecs import Choice, Number, Quantity, Range, Several, Words
from fieldkit.ui.forms.named import ContentsName, MaterialName, PipeSize, Schedule
from fieldkit.ui.forms.offers import Offer, OffersOf, fixed
from fieldkit.ui.forms.tables import FORMS, FREQUENCY, LENGTH, SPEED, UNITS, Field, Form
from fieldkit.ui.start.picker import home_short


@dataclass(frozen=True)
class Step:
    """One stage of the guided path."""

    table: str
    """``pipe``, ``goal``, or the repeated table it fills."""
    title: str
    question: str
    form: Form
    least: int = 0
    """Rows there must be before the next step."""
    empty: str = ""
    """What an empty list means."""

    @property
    def repeated(self) -> bool:
        """Whether it fills a list."""
        return self.form.repeated


@dataclass(frozen=True)
class SpeedOrHertz:
    """A shaft speed, or frequencies for what has no shaft; both are checked by the job as well."""

    hint: str = "'1480 rpm', '1450 to 1495 rpm', or '100 Hz' of a steady frequency"

    def shown(self, value: object, units: str) -> str:
        """As understood."""
        try:
            return Range(SPEED).shown(value, units)
        except InputError:
            return Range(FREQUENCY).shown(value, units)


@dataclass(frozen=True)
class NewFile:
    """A file that may be written: it does not exist, and its folder does."""

    hint: str = "a new file, such as job.toml; recordings will lie beside it"

    def shown(self, value: object, units: str) -> str:
        """The folder it will lie in."""
        path = Path(str(value)).expanduser().absolute()
        if path.exists():
            raise InputError(f"{quoted(path.name)} exists already", "choose another name")
        if not path.parent.is_dir():
            raise InputError(f"there is no folder {quoted(str(path.parent))}", "create it first")
        return f"in {home_short(path.parent)}"


def heading_offers(draft: Draft) -> OffersOf:
    """The six directions, told by what they do to the leg before."""

    def offered(_values: Mapping[str, str]) -> Sequence[Offer]:
        legs, number = draft.of("leg"), draft.at.get("leg", len(draft.of("leg")))
        before = legs[number - 1].get("direction", "") if 0 < number <= len(legs) else ""
        return [
            Offer(one.value, _turn(one, before))
            for one in offers.HEADINGS({})
            if not _is_back(one.value, before)
        ]

    return offered


def _turn(offer: Offer, before: str) -> str:
    if not before:
        return offer.said
    return "straight on" if offer.value == before else f"bend: {offer.said}"


def _is_back(heading: str, before: str) -> bool:
    return bool(before) and heading[1:] == before[1:] and heading != before


def station_offers(draft: Draft) -> OffersOf:
    """The ends, the corners, and the supports that are there."""

    def offered(_values: Mapping[str, str]) -> Sequence[Offer]:
        try:
            span = job_of(draft).span
        except FieldkitError:
            return ()
        places, station = [(0.0, "start")], 0.0
        for number, leg in enumerate(span.legs, start=1):
            station += leg.length_m
            last = number == len(span.legs)
            places.append((station, "end" if last else f"corner {number}"))
        return [Offer(station_text(at_m, draft.units), said) for at_m, said in places]

    return offered


def station_text(at_m: float, units: str) -> str:
    """A station with as many digits as it takes not to lie beyond it: the end must stay on."""
    texts = (show(at_m, "length", units, digits) for digits in range(4, 12))
    return next(
        (text for text in texts if -1e-5 <= parse(text, "length") - at_m <= 1e-7),
        show(at_m, "length", units, 12),
    )


def order_offers(values: Mapping[str, str]) -> Sequence[Offer]:
    """The orders the kind of machine is known for."""
    known = orders_of(values)
    return [Offer(known, "common practice")] if known else ()


def usual_orders(values: Mapping[str, str]) -> str:
    """What an empty line of orders stands for."""
    known = orders_of(values)
    return f"{known} (usual)" if known else ""


def counted(values: Mapping[str, str]) -> str:
    """What is to be counted on this kind of machine."""
    machine = MACHINES.get(values.get("machine", ""))
    if machine is None:
        return ""
    return f"{machine.counted}: count them" if machine.counted else "nothing to count"


def goal_file(draft: Draft, folder: Path) -> str:
    """A free name for the job file, made of its title."""
    letters = "".join(c if c.isalnum() and c.isascii() else "-" for c in draft.title.lower())
    stem = "-".join(part for part in letters.split("-") if part)[:40] or "job"
    path, number = folder / f"{stem}.toml", 1
    while path.exists():
        number += 1
        path = folder / f"{stem}-{number}.toml"
    return path.name


SHORTER = {
    "bend_radius": "long radius",
    "vertical": "by its kind",
    "lateral": "by its kind",
    "tolerance": "10 %",
}
"""What leaving a field out means, where there is little room."""
FILL_OFFERS = fixed(
    Offer("full", "as it runs"),
    Offer("drained", "empty when tapped"),
    Offer("not known", "anything between"),
)
PIPE = Form(
    "pipe",
    "Pipe",
    (
        Field("title", "name of the line", Words("any words, such as Glycol booster discharge"),
              when_empty="New job"),
        Field("units", "units to show", Choice(("SI", "US")), when_empty="SI", offers=UNITS),
        Field("size", "pipe size", PipeSize(measured=True), needed=True, offers=offers.sizes),
        Field("schedule", "schedule", Schedule(measured=True), needed=True,
              offers=offers.schedules()),
        Field("material", "material", MaterialName(), when_empty="carbon steel",
              offers=offers.materials),
        Field("contents", "contents", ContentsName(density=True), when_empty="water",
              offers=offers.contents),
        Field("tapped", "when tapped", Choice(tuple(FILLS)), when_empty="full",
              offers=FILL_OFFERS),
        Field("temperature", "running at", Quantity("temperature"), when_empty="as tapped"),
    ),
)  # fmt: skip
MACHINE = Form(
    "excitation",
    "Excitation",
    (
        Field("machine", "what shakes it", Choice(tuple(MACHINES)), needed=True,
              offers=offers.machines),
        Field("speed", "speed or Hz", SpeedOrHertz(), needed=True),
        Field("count", "how many", Number(1, 200, whole=True), when_empty="vanes, teeth…",
              implied=counted),
        Field("orders", "orders", Several(Number(0.01, 1000.0)), when_empty="by its kind",
              offers=order_offers, implied=usual_orders),
        Field("name", "its name", Words("pump A"), when_empty="by its kind"),
    ),
    repeated=True,
)  # fmt: skip
GOAL = Form(
    "goal",
    "Goal",
    (
        Field("margin", "keep clear by", Number(0.0, 0.9), when_empty="20 % of the frequency"),
        Field("chance", "wanted chance", Number(0.01, 0.999), when_empty="90 %"),
        Field("up_to", "ignore above", FREQUENCY, when_empty="200 Hz"),
        Field("keep_out", "nothing fits at", Several(Range(LENGTH), joint="; "),
              when_empty="every station is free"),
        Field("file", "save as", NewFile(), when_empty="not yet: in no file"),
    ),
)  # fmt: skip


def steps_for(draft: Draft) -> tuple[Step, ...]:
    """The path, with the choices that follow from what is known so far."""
    stations = station_offers(draft)
    leg = _with_offers(_only("leg"), {"direction": heading_offers(draft)})
    support = _with_offers(_only("support", "at", "kind", "vertical", "lateral"), {"at": stations})
    mass = _with_offers(_only("mass", "name", "at", "mass", "tolerance"), {"at": stations})
    return (
        Step("pipe", "Pipe", "What pipe is it? Read it off the pipe, or measure it.", PIPE),
        Step("leg", "Legs", "Which way does it run? Corner to corner, x and y level, z up.", leg, 1,
             "no leg yet: begin at one end"),
        Step("support", "Supports", "What holds it, and how far along from the start?", support, 1,
             "no support yet: the ends count too"),
        Step("mass", "Masses", "What heavy things sit on it: valves, flanges, actuators?", mass, 0,
             "no mass: enter on an empty line goes on"),
        Step("excitation", "Excitation", "What shakes it? The speed is on the machine's plate.",
             MACHINE, 0, "no machine yet: without one nothing can be detuned"),
        Step("goal", "Goal", "What is good enough? Empty lines take what is usual.", GOAL),
    )  # fmt: skip


def _only(table: str, *keys: str) -> Form:
    form = FORMS[table]
    fields = tuple(form.field(key) for key in keys) if keys else form.fields
    return Form(form.table, form.title, fields, repeated=form.repeated)


def _with_offers(form: Form, found: Mapping[str, OffersOf]) -> Form:
    from dataclasses import replace

    fields = tuple(
        replace(f, offers=found.get(f.key, f.offers), when_empty=SHORTER.get(f.key, f.when_empty))
        for f in form.fields
    )
    return replace(form, fields=fields)


def row_words(step: Step, row: Mapping[str, str]) -> str:
    """A finished row in short."""
    said = []
    for field in step.form.fields:
        if field.key == "count":
            continue
        if text := row.get(field.key, "").strip():
            word = field.label if field.said is None and step.table != "excitation" else field.said
            said.append(f"{word or ''} {text}".strip())
    if step.table == "excitation" and row.get("machine") != FIXED and not row.get("orders"):
        said.append(f"orders {orders_of(row)}")
    return ", ".join(said)
