"""Where the sample jobs lie, and copying them out."""

from __future__ import annotations

import shutil
from pathlib import Path

from fieldkit.errors import InputError, Place

DEFAULT = "glycol-booster"


def sample_root() -> Path:
    """The samples inside the installed package, or beside it in a source tree."""
    package = Path(__file__).resolve().parent.parent
    inside = package / "samples"
    return inside if inside.is_dir() else package.parent / "samples"


def sample_jobs(root: Path | None = None) -> tuple[Path, ...]:
    """The job files of all samples, the default one first."""
    found = sorted((root or sample_root()).glob("*/job.toml"))
    return tuple(sorted(found, key=lambda path: path.parent.name != DEFAULT))


def copy_samples(target: Path) -> tuple[Path, ...]:
    """Copy every sample job with its recordings below ``target``; never overwrites."""
    jobs = sample_jobs()
    taken = [target / job.parent.name for job in jobs if (target / job.parent.name).exists()]
    if taken:
        raise InputError(
            f"{taken[0]} is there already",
            "name another folder, so that nothing of yours is overwritten",
            Place(file=target),
        )
    try:
        for job in jobs:
            shutil.copytree(job.parent, target / job.parent.name)
    except OSError as error:
        raise InputError(
            f"the samples cannot be written ({error.strerror})",
            "name a folder that you may write to",
            Place(file=target),
        ) from error
    return tuple(target / job.parent.name / "job.toml" for job in jobs)
