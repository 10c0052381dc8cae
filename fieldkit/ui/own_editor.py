"""The job's text in the user's own editor, and back."""

from __future__ import annotations

import os
import shlex
import shutil
import subprocess
import tempfile
from collections.abc import Mapping
from pathlib import Path

from fieldkit.errors import InputError

USUAL = ("sensible-editor", "nano", "vim", "vi", "notepad")
"""Looked for in this order where the user names none."""
TAKES_LINE = ("vi", "vim", "nvim", "view", "nano", "emacs", "joe", "mg", "ne", "sensible-editor")
"""Editors that open at a line with ``+LINE``."""
REMEDY = "name one that is here, such as EDITOR=nano, and start fieldkit again"


def editor_command(environment: Mapping[str, str] | None = None) -> list[str]:
    """The user's editor as a command; raises InputError where there is none.

    ``VISUAL`` comes before ``EDITOR``, as is the custom.
    """
    environment = os.environ if environment is None else environment
    for name in ("VISUAL", "EDITOR"):
        if spoken := environment.get(name, "").strip():
            return _named(spoken, name)
    for editor in USUAL:
        if shutil.which(editor):
            return [editor]
    raise InputError("no text editor was found", REMEDY)


def _named(spoken: str, variable: str) -> list[str]:
    try:
        command = shlex.split(spoken, posix=os.name == "posix")
    except ValueError:
        command = [spoken]
    if not command or shutil.which(command[0]) is None:
        what = f"the editor that {variable} names is not here: {spoken!r}"
        raise InputError(what, REMEDY)
    return command


def edited(text: str, name: str, line: int | None = None) -> str:
    """The text after the user's editor closed; raises InputError where that did not work.

    The editor gets a copy: what it leaves there is checked before it becomes the job.
    """
    command = editor_command()
    with tempfile.TemporaryDirectory(prefix="fieldkit-") as folder:
        copy = Path(folder) / name
        copy.write_text(text, encoding="utf-8", newline="")
        at = [f"+{line}"] if line and Path(command[0]).stem in TAKES_LINE else []
        try:
            done = subprocess.run([*command, *at, str(copy)], check=False)
        except OSError as error:
            what = f"the editor {command[0]} did not start ({error.strerror})"
            raise InputError(what, REMEDY) from None
        if done.returncode:
            what = f"the editor {command[0]} ended with status {done.returncode}"
            raise InputError(what, "nothing was changed")
        return _read_back(copy)


def _read_back(copy: Path) -> str:
    try:
        return copy.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError:
        raise InputError("the editor saved it in another encoding", "save it as UTF-8") from None
    except OSError as error:
        what = f"what the editor left cannot be read ({error.strerror})"
        raise InputError(what, "nothing was changed") from None
