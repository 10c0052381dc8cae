"""Forms of the set-up: a channel, the recording, the next place, the reference shaker."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from fieldkit.capture.setup import CAPTURED, FORCE, ChannelSetup
from fieldkit.errors import InputError
from fieldkit.quantity import parse
from fieldkit.ui.capture.wiring import Wiring
from fieldkit.ui.forms.codecs import Choice, Codec, Number, Quantity
from fieldkit.ui.forms.tables import FORMS, Field, Form

if TYPE_CHECKING:
    from fieldkit.job.document import Job

MOST_SECONDS = 24 * 3600.0


@dataclass(frozen=True)
class Either:
    """What one of two codecs understands."""

    first: Codec
    second: Codec

    @property
    def hint(self) -> str:
        """Of both."""
        return f"{self.first.hint}; of a hammer {self.second.hint}"

    def shown(self, value: object, units: str) -> str:
        """As the one that understands it; else as the first objects."""
        try:
            return self.first.shown(value, units)
        except InputError:
            try:
                return self.second.shown(value, units)
            except InputError:
                return self.first.shown(value, units)


def _known(key: str) -> Field:
    return FORMS["recording"].field(key)


CHANNEL = Form(
    "recording",
    "Channel",
    (
        Field("quantity", "measures", Choice(CAPTURED), when_empty="acceleration"),
        replace(
            _known("sensitivity"),
            codec=Either(Quantity("sensitivity"), Quantity("force_sensitivity")),
        ),
        replace(_known("full_scale"), when_empty="of the input: see its manual"),
        _known("scale"),
        _known("direction"),
        _known("at"),
    ),
)
PLACE = Form("recording", "Next", (_known("direction"), _known("at")))
OTHER_WAY = {"vertical": "lateral", "lateral": "vertical"}
REFERENCE = Form(
    "recording",
    "Reference shaker",
    (Field("level", "level, rms", Quantity("acceleration"), needed=True),),
)


def texts_of(setup: ChannelSetup) -> dict[str, str]:
    """What the form of a channel starts with."""
    return setup.as_table()


def setup_with(setup: ChannelSetup, values: Mapping[str, str]) -> ChannelSetup:
    """A channel with what was typed; an empty text takes a key out. Raises InputError."""
    changed = {key: text or None for key, text in values.items()}
    if "quantity" in changed:
        changed["quantity"] = changed["quantity"] or "acceleration"
    return replace(setup, **changed)  # type: ignore[arg-type]


def place_form(channels: Sequence[ChannelSetup]) -> tuple[Form, dict[str, str]]:
    """What is asked where the sensors go elsewhere, and what it starts with.

    A single sensor may be turned too, the other way is offered; of several only the stations.
    """
    sensors = [(i, setup) for i, setup in enumerate(channels) if setup.quantity != FORCE]
    if len(sensors) == 1:
        setup = sensors[0][1]
        way = OTHER_WAY.get(setup.direction or "", "vertical")
        return PLACE, texts_of(replace(setup, direction=way))
    if len({setup.at for _, setup in sensors}) == 1:
        at = sensors[0][1].at
        form = Form("recording", "Next", (_known("at"),))
        return form, {"at": at} if at else {}
    fields = [
        replace(_known("at"), key=f"at {i}", label=f"{i + 1} {setup.direction or ''} at".strip())
        for i, setup in sensors
    ]
    texts = {f"at {i}": setup.at for i, setup in sensors if setup.at}
    return Form("recording", "Next", tuple(fields)), texts


def placed(channels: Sequence[ChannelSetup], values: Mapping[str, str]) -> tuple[ChannelSetup, ...]:
    """The channels with what was typed into that form; raises InputError."""
    out = []
    for i, setup in enumerate(channels):
        at = values.get(f"at {i}", values.get("at", ""))
        typed = {"at": at} | {key: values[key] for key in ("direction",) if key in values}
        out.append(setup if setup.quantity == FORCE else setup_with(setup, typed))
    return tuple(out)


def recording_form(wiring: Wiring, job: Job) -> Form:
    """Rate and channels; for a running recording its length and the speeds of the machines."""
    most = wiring.device.channels if wiring.device else 8
    fields = [Field("channels", "channels", Number(1, most, whole=True), needed=True)]
    if wiring.device is not None:
        fields.append(Field("rate", "rate", Quantity("frequency"), when_empty="of the input"))
    if wiring.kind == "running":
        seconds = Number(1.0, MOST_SECONDS)
        fields.append(Field("seconds", "length, s", seconds, needed=True))
        turning = machines(job)
        fields += [
            Field(
                f"speed of {name}",
                "speed now" if len(turning) == 1 else name,
                Quantity("speed"),
                when_empty=f"of {name}: not read",
            )
            for name in turning
        ]
    return Form("recording", "Recording", tuple(fields))


def machines(job: Job) -> dict[str, tuple[float, ...]]:
    """Orders of each machine that turns, by name."""
    return {one.name: one.orders for one in job.excitations if one.speed_hz is not None}


def recording_texts(wiring: Wiring) -> dict[str, str]:
    """What that form starts with."""
    texts = {"channels": str(len(wiring.typed)), "seconds": f"{wiring.seconds:g}"}
    if wiring.rate_hz is not None:
        texts["rate"] = f"{wiring.rate_hz} Hz"
    return texts | {f"speed of {n}": f"{60 * hz:g} rpm" for n, hz in wiring.speeds_hz.items()}


def wiring_with(wiring: Wiring, values: Mapping[str, str]) -> Wiring:
    """With what was typed into that form; raises InputError."""
    if "channels" in values:
        wiring = wiring.with_count(round(parse(values["channels"], "ratio")))
    if "rate" in values:
        wiring = _with_rate(wiring, values["rate"])
    if "seconds" in values:
        wiring = replace(wiring, seconds=parse(values["seconds"], "ratio"))
    speeds = dict(wiring.speeds_hz)
    for key, text in values.items():
        name = key.removeprefix("speed of ")
        if name != key:
            speeds.pop(name, None)
            speeds |= {name: parse(text, "speed")} if text else {}
    return replace(wiring, speeds_hz=speeds)


def _with_rate(wiring: Wiring, text: str) -> Wiring:
    rate_hz = round(parse(text, "frequency")) if text else None
    known = wiring.device.rates_hz if wiring.device else ()
    if rate_hz is not None and known and rate_hz not in known:
        listed = ", ".join(f"{rate / 1000:g}" for rate in known)
        raise InputError(f"the input does not take {text}", f"choose one of {listed} kHz")
    return replace(wiring, rate_hz=rate_hz)
