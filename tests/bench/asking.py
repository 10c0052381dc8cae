"""Words that the command lines of the benchmarks share."""

from __future__ import annotations

import argparse
from pathlib import Path


def parser(module: str, about: str | None, *options: str) -> argparse.ArgumentParser:
    """A command line with those of the shared options (keys of ``OPTIONS``) that are named."""
    made = argparse.ArgumentParser(
        prog=f"python -m {module}",
        description=about,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    for name in options:
        kind, default, explained = OPTIONS[name]
        made.add_argument(f"--{name}", type=kind, default=default, help=explained)
    return made


OPTIONS: dict[str, tuple[type, object, str]] = {
    "seed": (int, 1, "start of the random numbers"),
    "jobs": (int, 2, "processes"),
    "runs": (int, 3, "rounds, of which the median is taken"),
    "minutes": (int, 60, "length of the recording"),
    "job": (Path, Path("samples/riser/job.toml"), "job file"),
    "write": (Path, None, "write the table as Markdown into this file"),
    "plot": (Path, None, "draw a picture into this file"),
}
"""Type, default and help."""
