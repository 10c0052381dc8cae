"""Whether pictures may move by themselves, told by the surroundings."""

from __future__ import annotations

import os
from collections.abc import Mapping

SETTING = "FIELDKIT_MOTION"
"""``off`` keeps every picture still until it is started, ``on`` lets them move anywhere."""


def motion_wanted(environ: Mapping[str, str] = os.environ) -> bool:
    """Whether a picture may start to move unasked.

    Not where the user asked for stillness or for no colour, and not over a remote line, where each
    frame costs time that the keys need.
    """
    asked = environ.get(SETTING, "").lower()
    if asked in ("on", "off"):
        return asked == "on"
    still = environ.get("TEXTUAL_ANIMATIONS", "").lower() == "none" or "NO_COLOR" in environ
    remote = any(name in environ for name in ("SSH_CONNECTION", "SSH_TTY", "SSH_CLIENT"))
    poor = environ.get("TERM", "") in ("linux", "dumb")
    return not (still or remote or poor)
