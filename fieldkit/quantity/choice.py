"""One of a few words, with the nearest one offered where it is none of them."""

from __future__ import annotations

from difflib import get_close_matches

from fieldkit.errors import InputError
from fieldkit.quantity.reading import quoted


def chosen(value: object, noun: str, words: tuple[str, ...]) -> str:
    """The value where it is one of the words; raises InputError."""
    if isinstance(value, str) and value in words:
        return value
    close = get_close_matches(str(value).lower(), words, 1, 0.7)
    meant = f"did you mean {close[0]!r}? " if close else ""
    raise InputError(f"{quoted(value)} is not a {noun}", f"{meant}use {_either(words)}")


def _either(words: tuple[str, ...]) -> str:
    return f"{', '.join(words[:-1])} or {words[-1]}" if len(words) > 1 else words[0]
