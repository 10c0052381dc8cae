"""Edits of a TOML text that change what they are asked to and no other byte.

Values come rendered as TOML. Every function takes text that ``tomllib`` accepts and gives back
such text; comments, order, blank lines and line ends stay as the user left them.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from fieldkit.job.lines import Loc, Places, Spot, places

TABLE_ORDER = (
    "pipe", "contents", "state", "leg", "support", "mass",
    "excitation", "recording", "measured", "goal",
)  # fmt: skip
"""Order in which a person reads a job; a new table goes behind those before it."""

_BLANK = re.compile(r"(?:[ \t\r\n]+|#[^\n]*)*")
_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")


@dataclass(frozen=True)
class Section:
    """A header with everything that belongs to it, in whole lines."""

    loc: Loc
    start: int
    end: int
    spots: tuple[Spot, ...]
    """Its own statements and what they hold, without those of tables inside it."""


def set_value(text: str, loc: Loc, value: str) -> str:
    """Give a key a value; the key and the table around it are added where they are missing."""
    found = places(text)
    if spot := found.valued(loc):
        return text[: spot.value_start] + value + text[spot.end :]
    parent, key = loc[:-1], _key(loc[-1])
    pair = f"{key} = {value}"
    if inline := found.valued(parent) if parent else None:
        return _into_inline(found, inline, pair)
    if not parent or any(found.headers(parent)):
        return _insert_line(text, _end_of_statements(found, parent), pair)
    if dotted := _last_dotted(found, parent):
        spot, table = dotted
        name = ".".join(_key(part) for part in loc[len(table) :])
        return _insert_line(text, spot.end, f"{name} = {value}")
    if len(parent) == 1 or (parent[0] == "state" and not found.valued(("state",))):
        name = ".".join(_key(part) for part in parent)
        return _new_section(found, str(parent[0]), [f"[{name}]", pair], blank=True)
    return set_value(text, parent, f"{{ {pair} }}")


def remove_value(text: str, loc: Loc) -> str:
    """Take a key out, and the table around it when nothing is left in it."""
    found = places(text)
    spot = found.valued(loc)
    if spot is None:
        return text
    if spot.kind != "statement":
        start, end = _with_comma(text, spot)
    else:
        start, end = _line_start(text, spot.start), _line_end(text, spot.end)
    left = text[:start] + text[end:]
    parent = loc[:-1]
    if not parent or isinstance(parent[-1], int) or not _is_empty(places(left), parent):
        return left
    return _without_empty(left, parent)


def add_entry(text: str, table: str, pairs: Mapping[str, str]) -> str:
    """Put one more ``[[table]]`` behind the last one."""
    found = places(text)
    lines = [f"{_key(key)} = {value}" for key, value in pairs.items()]
    if array := found.valued((table,)):
        return _append_item(found, array, "{ " + ", ".join(lines) + " }")
    sections = _entries(found, table)
    blank = _blank_before(text, sections[-1].start) if len(sections) > 1 else not sections
    return _new_section(found, table, [f"[[{table}]]", *lines], blank=blank)


def remove_entry(text: str, table: str, index: int) -> str:
    """Take an entry out, with the comment that stands directly above it (except the first's)."""
    found = places(text)
    if item := found.valued((table, index)):
        start, end = _with_comma(text, item)
        return text[:start] + text[end:]
    section = _entries(found, table)[index]
    start = _above_comments(text, section.start) if index > 0 else section.start
    before, after = text[:start], text[section.end :]
    if _blank_before(text, start) and after[:1] in ("\n", "\r"):
        after = after.removeprefix("\r").removeprefix("\n")
    return before + after


def move_entry(text: str, table: str, index: int, to: int) -> str:
    """Give an entry another place in the order; index errors are the caller's."""
    found = places(text)
    spans = _entry_spans(found, table)
    blocks = [text[start:end] for start, end in spans]
    blocks.insert(to, blocks.pop(index))
    if not found.valued((table,)):
        blocks = [block if block.endswith("\n") else block + _newline(text) for block in blocks]
    for (start, end), block in reversed(list(zip(spans, blocks, strict=True))):
        text = text[:start] + block + text[end:]
    return text


def _entry_spans(found: Places, table: str) -> list[tuple[int, int]]:
    if found.valued((table,)):
        items = (s for s in found.spots if s.kind == "element" and s.loc[:-1] == (table,))
        return [(item.value_start, item.end) for item in items]
    return [(section.start, section.end) for section in _entries(found, table)]


def _sections(found: Places) -> Iterator[Section]:
    """Every header with its whole lines, tables inside it included."""
    headers = [i for i, spot in enumerate(found.spots) if spot.kind == "header"]
    for number, first in enumerate(headers):
        header = found.spots[first]
        nexts = headers[number + 1 :]
        own_end = nexts[0] if nexts else len(found.spots)
        depth = len(header.loc)
        last = next((i for i in nexts if found.spots[i].loc[:depth] != header.loc), None)
        belonging = found.spots[first : last if last is not None else len(found.spots)]
        end = _line_end(found.text, max(spot.end for spot in belonging))
        own = tuple(found.spots[first + 1 : own_end])
        yield Section(header.loc, _line_start(found.text, header.start), end, own)


def _entries(found: Places, table: str) -> list[Section]:
    """The ``[[table]]`` sections in order."""
    return [
        section
        for section in _sections(found)
        if len(section.loc) == 2 and section.loc[0] == table and isinstance(section.loc[1], int)
    ]


def _end_of_statements(found: Places, table: Loc) -> int:
    """Offset behind the last statement directly in a table, or behind its header."""
    if not table:
        first = next((i for i, s in enumerate(found.spots) if s.kind == "header"), None)
        own: Sequence[Spot] = found.spots[:first]
        return max((spot.end for spot in own), default=0)
    header = next(found.headers(table))
    section = next(s for s in _sections(found) if s.loc == table)
    return max((spot.end for spot in section.spots), default=header.end)


def _last_dotted(found: Places, parent: Loc) -> tuple[Spot, Loc] | None:
    """The last statement that writes into a table by a dotted key, and the table it stands in."""
    table: Loc = ()
    last = None
    for spot in found.spots:
        table = spot.loc if spot.kind == "header" else table
        if spot.kind == "statement" and spot.loc[: len(parent)] == parent != table:
            last = (spot, table) if len(table) < len(parent) else last
    return last


def _insert_line(text: str, behind: int, line: str) -> str:
    """A new line behind the one that ends at or after an offset, indented like it."""
    newline = _newline(text)
    if behind == 0:
        return line + newline + text
    start, end = _line_start(text, behind), _line_end(text, behind)
    indent = re.match(r"[ \t]*", text[start:])
    gap = "" if text[:end].endswith("\n") else newline
    return text[:end] + gap + (indent[0] if indent else "") + line + newline + text[end:]


def _new_section(found: Places, table: str, lines: Sequence[str], *, blank: bool) -> str:
    text, newline = found.text, _newline(found.text)
    at = _place_for(found, table)
    gap = "" if not text[:at] or text[:at].endswith("\n") else newline
    gap += newline if blank and at else ""
    return text[:at] + gap + newline.join(lines) + newline + text[at:]


def _place_for(found: Places, table: str) -> int:
    """Behind the last table that a person reads before this one; else at the end."""
    rank = TABLE_ORDER.index(table) if table in TABLE_ORDER else len(TABLE_ORDER)
    before = [s.end for s in _sections(found) if s.loc[0] in TABLE_ORDER[: rank + 1]]
    return max(before, default=len(found.text))


def _into_inline(found: Places, table: Spot, pair: str) -> str:
    inner = [s for s in found.spots if table.value_start < s.start and s.end < table.end]
    if not inner:
        return found.text[: table.value_start] + f"{{ {pair} }}" + found.text[table.end :]
    end = max(spot.end for spot in inner)
    return f"{found.text[:end]}, {pair}{found.text[end:]}"


def _append_item(found: Places, array: Spot, item: str) -> str:
    inner = [s for s in found.spots if array.value_start < s.value_start and s.end < array.end]
    if not inner:
        return found.text[: array.value_start] + f"[{item}]" + found.text[array.end :]
    end = max(spot.end for spot in inner)
    return f"{found.text[:end]}, {item}{found.text[end:]}"


def _with_comma(text: str, spot: Spot) -> tuple[int, int]:
    """Span of an item of an inline table or array, with the comma that it no longer needs."""
    behind = _BLANK.match(text, spot.end)
    after = behind.end() if behind else spot.end
    if text[after : after + 1] == ",":
        space = re.compile(r"[ \t]*").match(text, after + 1)
        return spot.start, space.end() if space else after + 1
    before = text[: spot.start].rstrip()
    return (len(before) - 1 if before.endswith(",") else spot.start), spot.end


def _is_empty(found: Places, table: Loc) -> bool:
    depth = len(table)
    return not any(spot.loc[:depth] == table and len(spot.loc) > depth for spot in found.spots)


def _without_empty(text: str, table: Loc) -> str:
    found = places(text)
    if found.valued(table):
        return remove_value(text, table)
    header = next(found.headers(table), None)
    if header is None:
        return text
    return text[: _line_start(text, header.start)] + text[_line_end(text, header.end) :]


def _above_comments(text: str, start: int) -> int:
    """Start of the comment lines directly above an offset at the start of a line."""
    while start > 0:
        line = _line_start(text, start - 1)
        if not text.startswith("#", line):
            break
        start = line
    return start


def _blank_before(text: str, start: int) -> bool:
    above = text[:start].replace("\r\n", "\n")
    return above.endswith("\n\n") or not above


def _newline(text: str) -> str:
    return "\r\n" if "\r\n" in text else "\n"


def _line_start(text: str, offset: int) -> int:
    return text.rfind("\n", 0, offset) + 1


def _line_end(text: str, offset: int) -> int:
    """One past the line's end, its line break included."""
    end = text.find("\n", offset)
    return len(text) if end < 0 else end + 1


def _key(part: str | int) -> str:
    from tomlkit import item

    name = str(part)
    return name if _BARE_KEY.fullmatch(name) else str(item(name).as_string())
