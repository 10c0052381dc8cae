"""One blow over all channels: what each sensor and the hammer heard of it, and one verdict."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fieldkit.capture.blow import BlowReading, read_blow
from fieldkit.capture.force import ForceReading, read_force, struck
from fieldkit.capture.places import Ear, Place
from fieldkit.capture.verdict import CLIPPED, NO_FORCE, Verdict
from fieldkit.signal.response import Struck

Real = NDArray[np.float64]

LEADS = 0.3
"""Of the loudest: a sensor that hears so much of a blow was struck its way."""


@dataclass(frozen=True, eq=False)
class JointReading:
    """What a record of one blow says."""

    frame: int
    """Of the blow, in the count of the session."""
    verdict: Verdict
    ears: tuple[Ear, ...]
    readings: tuple[BlowReading, ...]
    """Of each ear."""
    lead: int
    """Index of the loudest."""
    rang: tuple[Place, ...]
    """Places that it was struck for: they ring nearly as loud as the loudest, or louder."""
    force: ForceReading | None = None
    remark: str = ""
    """What to change though it counts."""
    end: int = 0
    """Frame behind its record, in the count of the session."""
    struck: tuple[Struck, ...] = ()
    """Force and response of each ear; empty where it does not count, or there is no hammer."""

    def at(self, place: Place) -> tuple[int, ...]:
        """Indices of the ears at a place whose decay can be used."""
        return tuple(
            i
            for i, ear in enumerate(self.ears)
            if ear.place == place and self.readings[i].record is not None
        )


def read_joint(
    samples: NDArray[np.floating],
    rate_hz: float,
    blow: int,
    ears: Sequence[Ear],
    *,
    hammer: int | None = None,
    frame: int = 0,
    up_to_hz: float = 200.0,
    quiet: Sequence[Real] = (),
) -> JointReading:
    """Judge the blow at index ``blow`` of a record (n, channels).

    ``hammer`` is the channel of the force, from 0; ``quiet`` holds a background of each ear from
    elsewhere, used where the record has less.
    """
    signal = np.asarray(samples, float)
    readings = tuple(
        read_blow(
            signal[:, ear.channel],
            rate_hz,
            blow,
            frame=frame,
            up_to_hz=up_to_hz,
            quiet=quiet[i] if quiet else None,
        )
        for i, ear in enumerate(ears)
    )
    force = None if hammer is None else read_force(signal[:, hammer], rate_hz, blow)
    loudness = np.array([r.peak * e.scale for r, e in zip(readings, ears, strict=True)])
    leads = np.flatnonzero(loudness >= LEADS * loudness.max())
    verdict = joint_verdict(readings, ears, leads.tolist(), force)
    if not verdict.usable:
        readings = tuple(replace(reading, record=None) for reading in readings)
    usable = [i for i, reading in enumerate(readings) if reading.record is not None]
    rang = [ears[i].place for i in usable if i in leads] or [ears[i].place for i in usable]
    pairs: list[Struck] = []
    if verdict.usable and force is not None and force.pulse is not None and hammer is not None:
        channels = [signal[:, ear.channel] for ear in ears]
        pairs = [struck(c, signal[:, hammer], force.pulse, rate_hz, up_to_hz) for c in channels]
    return JointReading(
        frame,
        verdict,
        tuple(ears),
        readings,
        int(np.argmax(loudness)),
        tuple(dict.fromkeys(rang)),
        force,
        force.remark(up_to_hz) if force else "",
        frame - blow + len(signal),
        tuple(pairs),
    )


def joint_verdict(
    readings: Sequence[BlowReading],
    ears: Sequence[Ear],
    leads: Sequence[int],
    force: ForceReading | None = None,
) -> Verdict:
    """One verdict: clipped in any channel is clipped; weak only where no channel rings.

    What else is wrong counts in the channels that ``leads`` names, which hear the blow best; one
    that hears little of it only says nothing.
    """
    if clipped := [i for i, r in enumerate(readings) if r.verdict.kind == CLIPPED]:
        return _named(readings, ears, clipped[0])
    if force is not None and force.verdict.kind not in ("usable", NO_FORCE):
        return force.verdict
    faulty = [i for i in leads if not readings[i].verdict.usable]
    usable = [i for i, reading in enumerate(readings) if reading.verdict.usable]
    excused = [readings[i].verdict.weak for i in faulty]
    if faulty and not (usable and all(excused)):
        worst = min(faulty, key=lambda i: readings[i].verdict.weak)
        return _named(readings, ears, worst)
    if force is not None and not force.verdict.usable:
        return force.verdict
    return readings[usable[0]].verdict


def _named(readings: Sequence[BlowReading], ears: Sequence[Ear], index: int) -> Verdict:
    """The verdict of one ear, which is named where there are several."""
    verdict = readings[index].verdict
    if len(ears) == 1:
        return verdict
    return replace(verdict, what=f"{ears[index]}: {verdict.what}")
