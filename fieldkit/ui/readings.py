"""One reading per view in plain words: what it says, how sure that is, what to do next."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from itertools import chain
from typing import TYPE_CHECKING

from fieldkit.detune.excitation import excitation_band
from fieldkit.sheet.plain import percent
from fieldkit.ui.desk import Desk
from fieldkit.ui.diagnosis_words import first_part, first_verdict, in_short
from fieldkit.ui.words import count, hertz, plus_minus, ratio_percent, sentence

if TYPE_CHECKING:
    from fieldkit.signal.modes import MeasuredMode
    from fieldkit.signal.running import RunningLine


@dataclass(frozen=True)
class Reading:
    """A line for the foot of a view."""

    says: str
    sure: str = ""
    next: str = ""

    def __str__(self) -> str:
        following = f"→ {sentence(self.next)}" if self.next else ""
        parts = (sentence(self.says), sentence(self.sure), following)
        return " ".join(part for part in parts if part)

    def fitted(self, cells: int) -> str:
        """As much as fits: first the middle part goes, then the end."""
        whole, short = str(self), str(replace(self, sure=""))
        if len(whole) <= cells:
            return whole
        return short if len(short) <= cells else f"{short[: cells - 1]}…"


RESONANT = 0.1
"""A mode this close to a line, relative, is taken to answer it (common practice, no source)."""
NO_JOB = Reading("No job is open", next="press o to open one, n for a new one, s for a sample")


def reading(view: str, desk: Desk) -> Reading:
    """The reading of a view; asks for a job where there is none."""
    if desk.job is None:
        return NO_JOB
    return READERS[view](desk)


def waiting(desk: Desk, step: str, otherwise: str) -> Reading:
    """While a step has no result: being worked on, stopped, refused, failed or never asked."""
    if desk.awaits(step):
        return Reading(f"{step.capitalize()}: being worked out")
    if desk.stopped:
        return Reading("Stopped", next="press r to work the job out again")
    refused = desk.refusals(step)
    return Reading(refused[0] if refused else desk.failed or otherwise)


def _tap(desk: Desk) -> Reading:
    if not desk.has("tap"):
        return Reading(
            "Nothing tapped yet: frequencies below come from the description alone",
            next="tap it now with m, or name a recording with a",
        )
    modes = desk.workup.evidence.firm if desk.workup else ()
    if not modes:
        return waiting(
            desk,
            "tap",
            "No mode could be read from these taps: tap again at mid-span; reasons under x",
        )
    lowest = modes[0]
    return Reading(
        f"{count(len(modes), 'mode')}, lowest {measured(lowest)} Hz",
        _seen_in(desk, lowest),
        "tap the other direction too" if _one_direction(modes) else "go to Span (3)",
    )


def measured(mode: MeasuredMode) -> str:
    """Its frequency with its doubt."""
    return plus_minus(mode.frequency_hz, mode.frequency_sd_hz)


def _seen_in(desk: Desk, mode: MeasuredMode) -> str:
    if not mode.taps:
        return "typed in by hand"
    usable = sum(
        len(reading.records)
        for reading in (desk.workup.taps if desk.workup else ())
        if (reading.entry.direction, reading.entry.at_m) == (mode.direction, mode.at_m)
    )
    few = ", too few to trust its damping" if mode.taps < 3 else ""
    remarks = len(desk.workup.evidence.warnings) if desk.workup else 0
    more = f"; {count(remarks, 'remark')} under x" if remarks else ""
    return f"seen in {mode.taps} of {usable} usable taps{few}{more}"


def _one_direction(modes: tuple[MeasuredMode, ...]) -> bool:
    return len({mode.direction for mode in modes}) == 1


def _running(desk: Desk) -> Reading:
    if not desk.has("running"):
        return Reading(
            "No running recording: which line shakes the pipe is not known",
            next="record it running with m, or name a recording with a",
        )
    if desk.workup is None or not desk.workup.running:
        return waiting(desk, "running", "The running recording has not been read")
    lines = tuple(chain.from_iterable(r.picture.lines for r in desk.workup.running))
    if not lines:
        return Reading(
            "No line stands clear of the noise", next="record longer, or closer to mid-span"
        )
    verdict = first_verdict(desk)
    if verdict is not None:
        return Reading(in_short(verdict), next=first_part(verdict.measure_next))
    return _strongest_line(desk, max(lines, key=lambda line: line.rms))


def _strongest_line(desk: Desk, line: RunningLine) -> Reading:
    order = excitation_band(line.frequency_hz, desk.bands)
    name = f"on {order.name}" if order else "on no known order"
    says = f"The strongest line, {hertz(line.frequency_hz)} Hz, sits {name}"
    if line.frequency_hz > desk.up_to_hz:
        limit = f"modes were looked for up to {hertz(desk.up_to_hz)} Hz only"
        return Reading(says, limit, "raise up_to in the goal (3) to look there")
    mode_hz = nearest_mode(desk, line.frequency_hz)
    if mode_hz is None:
        return Reading(says, next="tap the pipe to learn whether a mode lies there")
    apart = abs(mode_hz / line.frequency_hz - 1)
    if apart < RESONANT:
        sure = f"a mode lies {ratio_percent(apart)} away: resonance is likely"
        return Reading(says, sure, "go to Detune (5)")
    return Reading(
        says,
        f"the nearest mode is {ratio_percent(apart)} away: forced, more than resonant",
        "look at the source as well as at the pipe",
    )


def nearest_mode(desk: Desk, frequency_hz: float) -> float | None:
    """The mode closest in ratio; None where there is none, or where none was looked for."""
    if frequency_hz > desk.up_to_hz:
        return None
    return min(desk.mode_hz, key=lambda other: abs(other / frequency_hz - 1), default=None)


def _span(desk: Desk) -> Reading:
    if desk.span_refused:
        return Reading(desk.span_refused)
    modes = desk.modes_of("running")
    if not modes:
        return waiting(desk, "span", "This span has no mode below the limit")
    says = f"As described the first mode runs at {hertz(modes[0].frequency_hz)} Hz"
    if not desk.measured_hz:
        return Reading(
            says,
            "support stiffness is a guess until a tap says otherwise",
            "tap it, or see Detune (5)",
        )
    return Reading(says, "the tap corrects it in Match", "edit with enter, then go to Match (4)")


def _match(desk: Desk) -> Reading:
    found = desk.workup.match if desk.workup else None
    if found is None and not desk.has("tap"):
        return Reading(
            "Nothing to match: no tap has been read",
            next="add a tap recording in Tap (1); Detune (5) works meanwhile, with wide doubt",
        )
    if found is None:
        return waiting(
            desk, "match", "The tap and the description do not agree on any plausible pipe"
        )
    informed = [p.name for p in found.parameters if p.informed]
    says = f"{len(found.pairs)} of {count(len(found.measured), 'measured mode')} explained"
    told = f"the tap told {' and '.join(informed[:2])}" if informed else "the tap told nothing new"
    return Reading(says, told, found.next_measurement or "go to Detune (5)")


def _detune(desk: Desk) -> Reading:
    found = desk.workup.detuning if desk.workup else None
    if found is None or desk.job is None:
        return waiting(desk, "detune", "There is nothing to detune from yet")
    wanted = desk.job.goal.chance
    says = f"As it is, {percent(found.chance_now)} chance of being clear"
    if found.chance_now >= wanted:
        return Reading(says, f"the {percent(wanted)} wanted is met", "leave the pipe as it is")
    best = next((fix for fix in found.fixes if fix.chance >= wanted), None)
    if best is None:
        best = max(found.fixes, key=lambda fix: fix.chance, default=None)
        reach = f"the best change reaches {percent(best.chance)}" if best else "no change was found"
        return Reading(
            says,
            f"{reach}, short of the {percent(wanted)} wanted",
            "try another speed, damping or an absorber, or a better tap",
        )
    return Reading(
        says,
        f"change {best.rank} reaches {percent(best.chance)}",
        "build it, tap again, and prove it with p",
    )


def _sheet(desk: Desk) -> Reading:
    if desk.workup is None:
        return waiting(desk, "sheet", "There is no result to write down yet")
    return Reading(
        "The advice as text, with what it rests on",
        next="save it with w; have it checked before anything is cut, welded or clamped",
    )


READERS: dict[str, Callable[[Desk], Reading]] = {
    "tap": _tap,
    "running": _running,
    "span": _span,
    "match": _match,
    "detune": _detune,
    "sheet": _sheet,
}
