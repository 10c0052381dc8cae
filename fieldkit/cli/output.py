"""What a command prints, where, and with which exit status."""

from __future__ import annotations

import json
import os
import sys
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import Any, NoReturn

from fieldkit.errors import Cancelled, InputError, Refusal
from fieldkit.progress import Progress
from fieldkit.sheet.plain import clean

DONE, UNANSWERED, BAD_INPUT, INTERRUPTED, BROKEN = 0, 1, 2, 130, 70


def answer(document: dict[str, Any], lines: Sequence[str], *, as_json: bool) -> None:
    """One JSON document, or lines for people, on standard output."""
    if as_json:
        text = json.dumps(document, indent=1, allow_nan=False, ensure_ascii=False)
    else:
        text = "\n".join(lines)
    sys.stdout.write(text + "\n")


@contextmanager
def answering(*, as_json: bool) -> Iterator[None]:
    """Turn every error into one sentence and the right exit status."""
    try:
        yield
        sys.stdout.flush()
    except Refusal as refusal:
        refuse(str(refusal), as_json=as_json)
    except InputError as error:
        reject(str(error), as_json=as_json)
    except (Cancelled, KeyboardInterrupt):
        _leave("stopped", INTERRUPTED)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(DONE)
    except Exception as error:
        if os.environ.get("FIELDKIT_DEBUG"):
            raise
        _leave(
            f"fieldkit failed on this input ({type(error).__name__}: {error}); nothing was "
            "changed; set FIELDKIT_DEBUG=1 to see where",
            BROKEN,
        )


def refuse(reason: str, *, as_json: bool) -> NoReturn:
    """The data cannot answer."""
    if as_json:
        answer({"refused": reason}, (), as_json=True)
    _leave(reason, UNANSWERED)


def reject(sentence: str, *, as_json: bool) -> NoReturn:
    """The input is bad."""
    if as_json:
        answer({"error": sentence}, (), as_json=True)
    _leave(sentence, BAD_INPUT)


def unanswered(sentence: str) -> NoReturn:
    """Leave with a reason, the answer as far as there is one being printed."""
    _leave(sentence, UNANSWERED)


def progress() -> Progress:
    """Steps on one line of standard error, where that is a terminal."""
    if not sys.stderr.isatty():
        return Progress()

    def show(message: str, fraction: float) -> None:
        text = "" if fraction >= 1 else f"{fraction:4.0%} {clean(message)}"
        sys.stderr.write(f"\r\x1b[K{text}")
        sys.stderr.flush()

    return Progress(on_step=show)


def clear_progress() -> None:
    """Take the progress line off the terminal before the answer."""
    if sys.stderr.isatty():
        sys.stderr.write("\r\x1b[K")


def _leave(sentence: str, status: int) -> NoReturn:
    clear_progress()
    sys.stderr.write(f"fieldkit: {clean(sentence)}\n")
    sys.exit(status)
