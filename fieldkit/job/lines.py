"""Where each key of a TOML text stands: for error messages, and for edits that touch nothing else.

A scanner, not a parser: it is given text that ``tomllib`` has accepted and only finds places.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Callable, Iterator
from contextlib import suppress
from dataclasses import dataclass, field, replace

Loc = tuple[str | int, ...]
"""Key path: ``("support", 1, "at")``."""

_BLANK = re.compile(r"(?:[ \t\r\n]+|#[^\n]*)*")
_SPACE = re.compile(r"[ \t]*")
_KEY_PART = re.compile(r'"(?:[^"\\\n]|\\.)*"|\'[^\'\n]*\'|[A-Za-z0-9_-]+')
_STRING = re.compile(
    r'"""(?:[^\\]|\\.)*?"{3,5}|\'\'\'.*?\'{3,5}|"(?:[^"\\\n]|\\.)*"|\'[^\'\n]*\'', re.DOTALL
)
_BARE_VALUE = re.compile(r"[^,\[\]{}#\r\n]*[^,\[\]{}#\r\n \t]")
_FIELD_PART = re.compile(r"([^.\[\]]+)|\[(\d+)\]")


@dataclass(frozen=True)
class Spot:
    """One header, statement, inline pair or array element, as offsets into the text."""

    loc: Loc
    kind: str
    """``header``, ``statement``, ``pair`` (inside an inline table) or ``element`` (of an array)."""
    start: int
    """Of its key; of its value for an element."""
    value_start: int
    end: int
    """One past its value, or past the closing bracket of a header."""


@dataclass
class Places:
    """The spots of a TOML text, in order of appearance."""

    text: str
    spots: list[Spot] = field(default_factory=list)
    _first: dict[Loc, int] = field(default_factory=dict)

    def add(self, spot: Spot) -> None:
        """Record a spot; whatever encloses it first appears here at the latest."""
        self.spots.append(spot)
        for length in range(len(spot.loc) + 1):
            self._first.setdefault(spot.loc[:length], spot.start)

    def line(self, loc: Loc) -> int:
        """Line (from 1) of a key path, or of the innermost table around it that exists."""
        while loc and loc not in self._first:
            loc = loc[:-1]
        return self.text.count("\n", 0, self._first.get(loc, 0) if loc else 0) + 1

    def valued(self, loc: Loc) -> Spot | None:
        """The spot that holds the value of a key path, if it is written as one."""
        return next((s for s in self.spots if s.loc == loc and s.kind != "header"), None)

    def headers(self, loc: Loc) -> Iterator[Spot]:
        """The headers of a table."""
        return (s for s in self.spots if s.loc == loc and s.kind == "header")


def places(text: str) -> Places:
    """Scan a TOML text; what comes after a place that cannot be read is left out."""
    found = Places(text)
    with suppress(_LostError, RecursionError):
        _Scanner(text, found).document()
    return found


def field_name(loc: Loc) -> str:
    """``support[1].at`` for ``("support", 1, "at")``; odd keys are quoted."""
    name = ""
    for part in loc:
        if isinstance(part, int):
            name += f"[{part}]"
        else:
            plain = part if re.fullmatch(r"[A-Za-z0-9_-]{1,60}", part) else repr(part[:60])
            name += f".{plain}" if name else plain
    return name


def field_loc(name: str) -> Loc:
    """The key path that ``field_name`` wrote."""
    return tuple(
        int(index) if index else part.strip("'") for part, index in _FIELD_PART.findall(name)
    )


class _LostError(Exception):
    """The text is not what the scanner expects at this place."""


class _Scanner:
    def __init__(self, text: str, found: Places) -> None:
        self.text = text
        self.found = found
        self.position = 0
        self.table: Loc = ()
        self.array_sizes: dict[Loc, int] = {}

    def document(self) -> None:
        self._skip(_BLANK)
        while self.position < len(self.text):
            if self._next() == "[":
                self._header()
            else:
                self._pair(self.table, "statement")
            self._skip(_BLANK)

    def _header(self) -> None:
        start = self.position
        brackets = 2 if self.text.startswith("[[", start) else 1
        self.position += brackets
        keys = self._keys()
        self._expect("]" * brackets)
        self.table = self._resolved(keys[:-1])
        self.table += (keys[-1],)
        if brackets == 2:
            index = self.array_sizes.get(self.table, 0)
            self.array_sizes[self.table] = index + 1
            self.table += (index,)
        else:
            self.table = self._resolved(keys)
        self.found.add(Spot(self.table, "header", start, start, self.position))

    def _resolved(self, keys: list[str]) -> Loc:
        """A header's path, through the last element of every array of tables on the way."""
        loc: Loc = ()
        for key in keys:
            loc += (key,)
            if size := self.array_sizes.get(loc):
                loc += (size - 1,)
        return loc

    def _pair(self, table: Loc, kind: str) -> None:
        start = self.position
        loc = table + tuple(self._keys())
        self._expect("=")
        self._skip(_SPACE)
        self._value(loc, kind, start)

    def _keys(self) -> list[str]:
        keys = []
        while True:
            self._skip(_SPACE)
            keys.append(_unquoted(self._take(_KEY_PART)))
            self._skip(_SPACE)
            if self._next() != ".":
                return keys
            self.position += 1

    def _value(self, loc: Loc, kind: str, start: int) -> None:
        value_start, index = self.position, len(self.found.spots)
        self.found.add(Spot(loc, kind, start, value_start, value_start))
        opening = self._next()
        if opening == "[":
            self._items("]", lambda i: self._value((*loc, i), "element", self.position))
        elif opening == "{":
            self._items("}", lambda _: self._pair(loc, "pair"))
        else:
            self._take(_STRING if opening in "\"'" else _BARE_VALUE)
        self.found.spots[index] = replace(self.found.spots[index], end=self.position)

    def _items(self, closing: str, item: Callable[[int], None]) -> None:
        self.position += 1
        index = 0
        while True:
            self._skip(_BLANK)
            if self._next() == closing:
                self.position += 1
                return
            item(index)
            index += 1
            self._skip(_BLANK)
            if self._next() == ",":
                self.position += 1

    def _next(self) -> str:
        if self.position >= len(self.text):
            raise _LostError
        return self.text[self.position]

    def _skip(self, pattern: re.Pattern[str]) -> None:
        match = pattern.match(self.text, self.position)
        self.position = match.end() if match else self.position

    def _take(self, pattern: re.Pattern[str]) -> str:
        match = pattern.match(self.text, self.position)
        if match is None or match.end() == self.position:
            raise _LostError
        self.position = match.end()
        return match[0]

    def _expect(self, mark: str) -> None:
        self._skip(_SPACE)
        if not self.text.startswith(mark, self.position):
            raise _LostError
        self.position += len(mark)


def _unquoted(key: str) -> str:
    return str(tomllib.loads(f"key = {key}")["key"]) if key[0] in "\"'" else key
