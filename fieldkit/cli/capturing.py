"""The commands that listen: which inputs there are, and record from one of them."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import typer

from fieldkit.cli import capture_options as option
from fieldkit.cli import output

if TYPE_CHECKING:
    from fieldkit.cli.recording import Plan


def devices(as_json: option.AsJson = False) -> None:
    """List the inputs that can be recorded from."""
    with output.answering(as_json=as_json):
        from fieldkit.capture.devices import list_inputs
        from fieldkit.cli.capture_tables import input_documents, input_lines

        found = list_inputs()
        output.answer({"inputs": input_documents(found)}, input_lines(found), as_json=as_json)


def record(
    target: option.Target,
    device: option.Device = None,
    rate: option.Rate = None,
    channels: option.Channels = None,
    seconds: option.Seconds = None,
    quantity: option.Quantity = None,
    sensitivity: option.Sensitivity = None,
    full_scale: option.FullScale = None,
    direction: option.Direction = None,
    at: option.At = None,
    kind: option.Kind = "tap",
    preset: option.UsePreset = None,
    keep: option.Keep = None,
    wait: option.Wait = 30.0,
    practice: option.Practice = False,
    calibrate: option.Calibrate = False,
    reference: option.Reference = "10 m/s^2",
    channel: option.Channel = 1,
    as_json: option.AsJson = False,
) -> None:
    """Record until Enter, Ctrl-C or a stated length, straight to disk."""
    with output.answering(as_json=as_json):
        from fieldkit.cli.recording import Plan

        told = {
            "quantity": quantity,
            "sensitivity": sensitivity,
            "full_scale": full_scale,
            "direction": direction,
            "at": at,
        }
        plan = Plan.from_words(
            target, kind, device, rate, channels, seconds, told, preset, wait, practice
        )
        if calibrate:
            from fieldkit.cli.calibrating import calibrated

            output.answer(*calibrated(plan, channel, reference, keep), as_json=as_json)
        else:
            _record(plan, keep, as_json=as_json)


def _record(plan: Plan, keep: str | None, *, as_json: bool) -> None:
    """What was recorded is told, and its set-up kept where that is asked for."""
    from fieldkit.cli.capture_tables import recorded_document, recorded_lines
    from fieldkit.cli.recording import made

    done = made(plan)
    if keep is not None:
        plan.keep(keep, done.snapshot)
    _answer(recorded_document(done), recorded_lines(done), done.failure, as_json=as_json)


def _answer(document: dict[str, Any], lines: list[str], failure: str, *, as_json: bool) -> None:
    """What was recorded is told, also where it ended early."""
    if not failure:
        output.answer(document, lines, as_json=as_json)
        return
    output.answer(document | {"refused": failure}, lines, as_json=as_json)
    output.unanswered(failure)


def register(app: typer.Typer) -> None:
    """Add the commands."""
    app.command(epilog="Example: fieldkit devices --json")(devices)
    app.command(
        epilog="Example: fieldkit record job.toml --sensitivity '100 mV/g' --full-scale '1.4 V' "
        "--direction vertical --at '1.9 m'"
    )(record)
