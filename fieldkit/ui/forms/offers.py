"""What a field offers to choose from while it is typed into."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Offer:
    """One thing to choose."""

    value: str
    """As it will stand in the field."""
    said: str = ""
    """What a person should know about it."""


Values = Mapping[str, str]
OffersOf = Callable[[Values], Sequence[Offer]]
"""From what the other fields of the form hold to what is offered."""


def ranked(offers: Sequence[Offer], typed: str) -> list[Offer]:
    """The offers that fit what is typed, the likeliest first; all of them for an empty text."""
    wanted = _plain(typed)
    if not wanted:
        return list(offers)
    marks = [(_distance(offer, wanted), number, offer) for number, offer in enumerate(offers)]
    return [offer for mark, _, offer in sorted(marks, key=lambda m: m[:2]) if mark < _FAR]


_FAR = 9


def _distance(offer: Offer, wanted: str) -> int:
    value, said = _plain(offer.value), _plain(offer.said)
    bare = value.removeprefix("nps ")
    if wanted in (value, bare):
        return 0
    if re.search(rf"(?<![\w/.-]){re.escape(wanted)}(?![\w/.-])", said):
        return 1
    for mark, text in ((2, bare), (2, value)):
        if text.startswith(wanted):
            return mark
    if any(word.startswith(wanted) for word in re.split(r"[\s(]+", value)):
        return 3
    if any(word.startswith(wanted) for word in re.split(r"[\s(]+", said)):
        return 4
    return _FAR


def _plain(text: str) -> str:
    return " ".join(text.lower().split())


def fixed(*offers: Offer) -> OffersOf:
    """The same offers whatever the other fields hold."""
    return lambda _values: offers


def sizes(_values: Values) -> Sequence[Offer]:
    """Standard pipe sizes with their outside diameters."""
    from fieldkit.span.pipes import known_sizes, nominal_diameter_mm

    return [Offer(f"NPS {nps}", f"DN {nominal_diameter_mm(nps)}") for nps in known_sizes()]


def schedules(size_key: str = "size") -> OffersOf:
    """Schedules in which the size of another field exists, with their walls."""

    def offered(values: Values) -> Sequence[Offer]:
        from fieldkit.errors import InputError
        from fieldkit.span.pipes import known_schedules, standard_pipe

        size = values.get(size_key, "").strip()
        try:
            found = [(name, standard_pipe(size, name)) for name in known_schedules(size)]
        except InputError:
            return ()
        return [Offer(name, f"wall {pipe.wall_m * 1e3:.2f} mm") for name, pipe in found]

    return offered


def materials(_values: Values) -> Sequence[Offer]:
    """Materials that are known by name."""
    from fieldkit.span.materials import MATERIALS

    return [Offer(name) for name in MATERIALS]


def contents(_values: Values) -> Sequence[Offer]:
    """Contents that are known by name."""
    from fieldkit.span.materials import CONTENTS

    return [Offer(name, f"{density:g} kg/m³") for name, density in CONTENTS.items()]


SUPPORT_WORDS = {
    "anchor": "holds all ways and against turning",
    "nozzle": "flange of a machine or vessel",
    "clamp": "grips the pipe on steel",
    "u-bolt": "a rod bent round the pipe",
    "guide": "holds across, lets it slide along",
    "rest": "carries weight, nothing else",
    "hanger": "hangs from a rod or spring",
    "branch": "fitting on a bigger pipe",
    "brace": "from a branch to its header",
    "free": "only the stiffness you type",
}
"""What each kind of support does, for who chooses one."""


def support_kinds(_values: Values) -> Sequence[Offer]:
    """Kinds of support."""
    from fieldkit.span.supports import KINDS

    return [Offer(kind, SUPPORT_WORDS.get(kind, "")) for kind in KINDS]


STIFFNESSES = fixed(
    Offer("unknown", "let the tap tell"),
    Offer("rigid", "does not give at all"),
    Offer("free", "does not hold this way"),
)
STATES = fixed(Offer("tapped", "as it was struck"), Offer("running", "as it shakes"))
MOTIONS = fixed(
    Offer("vertical", "up and down"),
    Offer("lateral", "level, across the pipe"),
    Offer("axial", "along the pipe"),
    Offer("x"),
    Offer("y"),
    Offer("z", "up"),
)
HEADINGS = fixed(
    Offer("+x", "level"),
    Offer("-x", "level, back"),
    Offer("+y", "level, left"),
    Offer("-y", "level, right"),
    Offer("+z", "up"),
    Offer("-z", "down"),
)
MASS_NAMES = fixed(
    Offer("gate valve"),
    Offer("globe valve"),
    Offer("check valve"),
    Offer("control valve", "with its actuator"),
    Offer("relief valve"),
    Offer("flange pair", "with gasket and bolts"),
    Offer("strainer"),
    Offer("flow meter"),
    Offer("actuator"),
)
TOLERANCES = fixed(
    Offer("2 %", "weighed"),
    Offer("10 %", "from a catalogue"),
    Offer("30 %", "guessed"),
)


def machines(_values: Values) -> Sequence[Offer]:
    """Kinds of machines with what their pulsation is counted by."""
    from fieldkit.job.machines import FIXED, MACHINES

    return [
        Offer(name, "mains, vortex" if name == FIXED else machine.counted)
        for name, machine in MACHINES.items()
    ]
