"""Where what belongs to the user, and to no one job, lies on this computer."""

from __future__ import annotations

from pathlib import Path


def state_folder() -> Path:
    """The user's own folder for lists and unsaved work, where this system keeps such things."""
    from platformdirs import user_state_path

    return user_state_path("fieldkit")
