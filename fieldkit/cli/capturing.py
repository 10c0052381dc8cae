"""The commands that listen: which inputs there are, and record from one of them."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from fieldkit.cli import output

Each = "one for each channel, or one for all"
Quantity = Annotated[
    list[str] | None, typer.Option(help=f"What a channel measures (acceleration): {Each}.")
]
Sensitivity = Annotated[
    list[str] | None, typer.Option(help=f"Of the sensor, such as '100 mV/g': {Each}.")
]
FullScale = Annotated[
    list[str] | None, typer.Option(help=f"Voltage of a full input, such as '1.4 V': {Each}.")
]
Direction = Annotated[
    list[str] | None, typer.Option(help=f"vertical, lateral, axial, x, y or z: {Each}.")
]
At = Annotated[list[str] | None, typer.Option(help=f"Station, such as '1.9 m': {Each}.")]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document.")]


def devices(as_json: AsJson = False) -> None:
    """List the inputs that can be recorded from."""
    with output.answering(as_json=as_json):
        from fieldkit.capture.devices import list_inputs
        from fieldkit.cli.capture_tables import input_documents, input_lines

        found = list_inputs()
        output.answer({"inputs": input_documents(found)}, input_lines(found), as_json=as_json)


def record(
    target: Annotated[
        Path, typer.Argument(metavar="FILE|JOB", help="WAV file to make, or job file to add to.")
    ],
    device: Annotated[
        str | None, typer.Option(help="Number or name of the input, as `devices` lists it.")
    ] = None,
    rate: Annotated[int | None, typer.Option(help="Sampling rate, Hz.", min=100)] = None,
    channels: Annotated[int | None, typer.Option(help="How many channels.", min=1)] = None,
    seconds: Annotated[
        float | None, typer.Option(help="Length; without it, until Enter or Ctrl-C.", min=0.1)
    ] = None,
    quantity: Quantity = None,
    sensitivity: Sensitivity = None,
    full_scale: FullScale = None,
    direction: Direction = None,
    at: At = None,
    kind: Annotated[str, typer.Option(help="tap or running.")] = "tap",
    preset: Annotated[str | None, typer.Option(help="Use a set-up kept under this name.")] = None,
    keep: Annotated[str | None, typer.Option(help="Keep the set-up under this name.")] = None,
    wait: Annotated[
        float, typer.Option(help="Seconds to wait for an input that is gone.", min=0.0)
    ] = 30.0,
    practice: Annotated[
        bool,
        typer.Option(
            "--practice", help="Record a simulated span that strikes itself; needs no sensor."
        ),
    ] = False,
    calibrate: Annotated[
        bool,
        typer.Option(
            "--calibrate", help="Measure the sensitivity of a channel on a reference shaker."
        ),
    ] = False,
    reference: Annotated[
        str, typer.Option(help="Level of the reference shaker, rms, such as '1 g'.")
    ] = "10 m/s^2",
    channel: Annotated[int, typer.Option(help="The channel to calibrate.", min=1)] = 1,
    as_json: AsJson = False,
) -> None:
    """Record until Enter, Ctrl-C or a stated length, straight to disk."""
    with output.answering(as_json=as_json):
        from fieldkit.cli.calibrating import calibrated
        from fieldkit.cli.capture_tables import recorded_document, recorded_lines
        from fieldkit.cli.recording import Plan, made

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
            output.answer(*calibrated(plan, channel, reference, keep), as_json=as_json)
            return
        done = made(plan)
        if keep is not None:
            plan.keep(keep, done.snapshot)
        document = recorded_document(done)
        _answer(document, recorded_lines(done), done.failure, as_json=as_json)


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
