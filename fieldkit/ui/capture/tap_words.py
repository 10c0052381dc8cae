"""What the screen of a guided tap test says, from one look at it."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING

from fieldkit.capture import verdict as verdicts
from fieldkit.capture.guide import READING
from fieldkit.capture.meter import decibels
from fieldkit.capture.places import together
from fieldkit.capture.setup import FORCE
from fieldkit.capture.snapshot import ENDED, OPENING, PAUSED, RUNNING, WAITING
from fieldkit.capture.trigger import ARMED, LISTENING, RECORDING
from fieldkit.ui.plots import SHORT, mode_cells
from fieldkit.ui.words import count, sentence

if TYPE_CHECKING:
    from fieldkit.capture.guide import Blow
    from fieldkit.capture.guide_snapshot import GuideSnapshot
    from fieldkit.capture.places import Place
    from fieldkit.capture.snapshot import Snapshot
    from fieldkit.signal.modes import MeasuredMode
    from fieldkit.ui.capture.tap_run import TapLook

VERDICT_S = 1.5
"""A verdict stands in large letters for so long."""
NEWS_S = 8.0
"""What happened to the input is told for so long."""
CALM, GO, GOOD, BAD = "calm", "go", "good", "bad"
"""Tones of the large words, each a colour; the words alone say it too."""

_VERDICTS = {
    verdicts.USABLE: "good blow",
    verdicts.CLIPPED: "clipped",
    verdicts.DOUBLE: "double",
    verdicts.WEAK: "too weak",
    verdicts.CUT_SHORT: "cut short",
    verdicts.MACHINE: "too loud",
    verdicts.GAP: "frames lost",
    verdicts.NO_BLOW: "no blow",
    verdicts.NO_FORCE: "no force",
    verdicts.REFUSED: "not usable",
}
_SESSION = {
    OPENING: ("one moment", "Opening the input.", CALM),
    WAITING: ("input gone", "Plug it in again: it goes on by itself.", BAD),
    ENDED: ("stopped", "Press s to keep what was recorded, or esc to leave.", BAD),
    PAUSED: ("paused", "What comes now is not recorded.", CALM),
}
_TOO_LOUD = 0.5
_CORNER = 30


def headline(look: TapLook, verdict_age_s: float) -> tuple[str, str, str]:
    """(large words, one line below, tone); the verdict stands first for VERDICT_S."""
    if look.session.state in _SESSION:
        return _SESSION[look.session.state]
    guide, latest = look.guide, look.guide.latest
    if latest is not None and verdict_age_s < VERDICT_S and guide.phase != RECORDING:
        tone = GOOD if latest.counts else BAD
        below = sentence(latest.verdict.change) or "It counts. Wait until it is armed again."
        return _VERDICTS[latest.verdict.kind], below, tone
    return _phase(guide)


def _phase(guide: GuideSnapshot) -> tuple[str, str, str]:
    if guide.phase == LISTENING:
        return "quiet please", "Measuring the background: keep still.", CALM
    if guide.phase == RECORDING:
        rung = "" if guide.ringing_s is None else f" {guide.ringing_s:.1f} of"
        return "ringing", f"Keep away, touch nothing:{rung} {guide.record_s:.1f} s at most.", CALM
    if guide.phase == READING:
        return "judging", "Reading the blow.", CALM
    if guide.loudest > _TOO_LOUD:
        return "too loud", "Stop the machine, or lower the input level.", BAD
    if guide.phase == ARMED and guide.worth.more == 0 and not guide.estimating:
        return "enough", "d goes to the next direction or place, s keeps it all.", GOOD
    if guide.phase == ARMED:
        return "tap now", f"{_strike(guide)}{_armed_at(guide)}", GO
    return "wait", "Until it is quiet again.", CALM


def _strike(guide: GuideSnapshot) -> str:
    way = guide.wanted.direction
    which = f" {way}" if way and len(guide.ears) > 1 else ""
    return f"Strike once{which}, then let it ring."


def _armed_at(guide: GuideSnapshot) -> str:
    """Where the line in the level meter stands."""
    if len(guide.thresholds) != 1:
        return " Armed at ┊." if guide.thresholds else ""
    return f" Armed at ┊ {decibels(guide.loudest):.0f} dB."


def meter_labels(look: TapLook, *, short: bool) -> list[str]:
    """Number and direction of every channel, or what it measures."""
    ways = [
        FORCE if setup.quantity == FORCE else setup.direction or setup.quantity
        for setup in look.channels
    ]
    return [f"{i + 1} {SHORT.get(way, way) if short else way}" for i, way in enumerate(ways)]


def heard(look: TapLook) -> str:
    """Whose spectrum is shown."""
    if len(look.guide.ears) == 1:
        return "live"
    return f"live {look.heard + 1} {look.channels[look.heard].direction or ''}".rstrip()


def side_lines(look: TapLook) -> list[str]:
    """Place and counts, three lines."""
    guide = look.guide
    here = [blow for blow in guide.blows if blow.places == guide.places]
    good = sum(blow.counts for blow in here)
    more = guide.worth.more
    worth = "no more needed" if more == 0 and good else f"{count(more, 'more blow')} worth it"
    return [_site(guide.places), f"{good} good of {count(len(here), 'blow')}", worth]


def _site(places: tuple[Place, ...]) -> str:
    """Where the sensors sit, in what the corner of a narrow screen holds."""
    long = together(places)
    if len(long) <= _CORNER:
        return long
    short = [replace(place, direction=SHORT.get(place.direction or "")) for place in places]
    return together(short)[:_CORNER]


def told(look: TapLook, news_age_s: float = 0.0) -> list[str]:
    """The latest blow and what to change; then what to do next, or what is wrong.

    What the session said ``news_age_s`` ago is told while it matters, for NEWS_S at most.
    """
    latest = look.guide.latest
    here = latest is not None and latest.places == look.guide.places
    first = _numbered(latest) if latest and here else "No blow here yet."
    running = look.session.state == RUNNING
    news = _news(look.session) if not running or news_age_s < NEWS_S else ""
    wrong = look.trouble or news or look.guide.notice
    if wrong and not running:
        return [f"! {sentence(wrong)}"]
    then = f"! {sentence(wrong)}" if wrong else f"Next: {look.guide.advice}"
    response = _response(look.guide)
    if latest and here and latest.counts:
        return [f"{first} {response}".rstrip(), then]
    return [first, then, response]


def _response(guide: GuideSnapshot) -> str:
    """How good the response to the hammer is so far, in a few words; empty without one."""
    state = guide.response
    if state is None or not state.coherence:
        return ""
    least = math.floor(100 * min(coherence for _, coherence in state.coherence)) / 100
    reach = "" if state.reaches_hz is None else f", force to {state.reaches_hz:.0f} Hz"
    return f"Coherence {least:.2f} or more at the modes{reach}."


def _news(session: Snapshot) -> str:
    failure = session.recording.failure if session.recording else ""
    return failure or session.message


def _numbered(blow: Blow) -> str:
    return f"{_glyph(blow)} Blow {blow.number}: {_result(blow)}"


def _result(blow: Blow) -> str:
    verdict = blow.verdict
    if blow.set_aside:
        return "Set aside by you; U takes it in again."
    if verdict.usable:
        remark = blow.joint.remark if blow.joint else ""
        return f"Usable. {sentence(remark)}".strip()
    return f"{sentence(verdict.what)} {sentence(verdict.change)}"


def _glyph(blow: Blow) -> str:
    return "–" if blow.set_aside else "✓" if blow.verdict.usable else "✗"


def blow_lines(guide: GuideSnapshot, rows: int) -> list[str]:
    """Every blow with its verdict, the latest first, as many as fit."""
    lines = [
        f"{blow.number:3} {_glyph(blow)} "
        f"{_struck_way(blow):4} "
        f"{'set aside' if blow.set_aside else blow.verdict.kind}"
        for blow in reversed(guide.blows)
    ]
    return _fitting(["blows", *lines], rows)


def _struck_way(blow: Blow) -> str:
    """Where it was struck for, or of what did not count, where it was to be heard."""
    places = blow.rang or blow.places
    ways = [SHORT.get(place.direction or "", place.direction or "?") for place in places]
    return ways[0] if len(ways) == 1 else "+".join(way[0] for way in ways)


def mode_lines(guide: GuideSnapshot, rows: int) -> list[str]:
    """Modes at this place with their scatter, as many as fit."""
    estimate = guide.estimate
    if estimate is None or not (estimate.modes or estimate.warnings):
        return ["modes Hz, damping %", "  none yet" if not guide.estimating else "  reading ..."]
    head = f"modes from {count(guide.estimated_from, 'blow')}: Hz, %"
    several = len(guide.ears) > 1
    lines = [_mode_line(mode, several) for mode in estimate.modes]
    lines += [sentence(warning) for warning in estimate.warnings if not estimate.modes]
    return _fitting([head, *lines], rows)


def _mode_line(mode: MeasuredMode, several: bool) -> str:
    hz, damping = mode_cells(mode)
    if not several:
        return f"{hz:>14}  {damping}"
    return f"{SHORT.get(mode.direction or '', mode.direction or '?'):4} {hz:>12} {damping}"


def _fitting(lines: list[str], rows: int) -> list[str]:
    if len(lines) <= max(rows, 2):
        return lines
    shown = max(rows - 1, 1)
    return [*lines[:shown], f"    and {len(lines) - shown} more"]
