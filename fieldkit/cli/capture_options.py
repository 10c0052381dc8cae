"""Options of the commands that listen."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

_EACH = "one for each channel, or one for all"

Target = Annotated[
    Path, typer.Argument(metavar="FILE|JOB", help="WAV file to make, or job file to add to.")
]
Device = Annotated[
    str | None, typer.Option(help="Number or name of the input, as `devices` lists it.")
]
Rate = Annotated[int | None, typer.Option(help="Sampling rate, Hz.", min=100)]
Channels = Annotated[int | None, typer.Option(help="How many channels.", min=1)]
Seconds = Annotated[
    float | None, typer.Option(help="Length; without it, until Enter or Ctrl-C.", min=0.1)
]
Quantity = Annotated[
    list[str] | None, typer.Option(help=f"What a channel measures (acceleration): {_EACH}.")
]
Sensitivity = Annotated[
    list[str] | None, typer.Option(help=f"Of the sensor, such as '100 mV/g': {_EACH}.")
]
FullScale = Annotated[
    list[str] | None, typer.Option(help=f"Voltage of a full input, such as '1.4 V': {_EACH}.")
]
Direction = Annotated[
    list[str] | None, typer.Option(help=f"vertical, lateral, axial, x, y or z: {_EACH}.")
]
At = Annotated[list[str] | None, typer.Option(help=f"Station, such as '1.9 m': {_EACH}.")]
Kind = Annotated[str, typer.Option(help="tap or running.")]
UsePreset = Annotated[str | None, typer.Option(help="Use a set-up kept under this name.")]
Keep = Annotated[str | None, typer.Option(help="Keep the set-up under this name.")]
Wait = Annotated[float, typer.Option(help="Seconds to wait for an input that is gone.", min=0.0)]
Practice = Annotated[
    bool,
    typer.Option(
        "--practice", help="Record a simulated span that strikes itself; needs no sensor."
    ),
]
Calibrate = Annotated[
    bool,
    typer.Option("--calibrate", help="Measure the sensitivity of a channel on a reference shaker."),
]
Reference = Annotated[str, typer.Option(help="Level of the reference shaker, rms, such as '1 g'.")]
Channel = Annotated[int, typer.Option(help="The channel to calibrate.", min=1)]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document.")]
