"""A new job while it is being described: the answers so far, and the job file they make."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Any

from fieldkit.errors import InputError
from fieldkit.job.machines import FIXED, MACHINES, orders_text
from fieldkit.job.typed import rendered, value_of
from fieldkit.quantity import parse

if TYPE_CHECKING:
    from fieldkit.job.document import Job
    from fieldkit.span.layout import Span

Answers = Mapping[str, str]
"""What was typed, by key."""
REPEATED = ("leg", "support", "mass", "excitation")

NO_LEG = ({"direction": "+x", "length": "10 m"},)
NO_SUPPORT = ({"at": "0 m", "kind": "free"},)
"""What stands in where nothing is known yet, so that the rest can be read."""

FILLS = {"drained": "0.0", "full": "1.0", "not known": "0 to 1"}
"""How full the pipe was when it was tapped, as the file says it."""


@dataclass(frozen=True)
class Draft:
    """Answers of the guided path; none of them need make sense yet."""

    pipe: Answers = field(default_factory=dict)
    goal: Answers = field(default_factory=dict)
    rows: Mapping[str, tuple[Answers, ...]] = field(default_factory=dict)
    """Finished rows by table."""
    half: Mapping[str, Answers] = field(default_factory=dict)
    """The row in hand by table, as far as it is typed."""
    at: Mapping[str, int] = field(default_factory=dict)
    """Which row is in hand; one past the last for a new one."""
    step: int = 0

    def of(self, table: str) -> tuple[Answers, ...]:
        """Finished rows of a table."""
        return self.rows.get(table, ())

    def with_answers(self, table: str, answers: Answers) -> Draft:
        """With other answers to ``pipe`` or ``goal``."""
        return replace(self, pipe=answers) if table == "pipe" else replace(self, goal=answers)

    def with_rows(self, table: str, rows: tuple[Answers, ...]) -> Draft:
        """With other finished rows of a table."""
        return replace(self, rows={**self.rows, table: rows})

    @property
    def title(self) -> str:
        """What the job is called."""
        return self.pipe.get("title", "").strip() or "New job"

    @property
    def units(self) -> str:
        """``SI`` or ``US``."""
        return "US" if self.pipe.get("units", "").strip().upper() == "US" else "SI"

    def with_half(self, table: str) -> Draft:
        """With the row in hand put where it will stand."""
        half = {key: text for key, text in self.half.get(table, {}).items() if text.strip()}
        if not half:
            return self
        rows = list(self.of(table))
        number = self.at.get(table, len(rows))
        rows[number : number + 1] = [half]
        return replace(self, rows={**self.rows, table: tuple(rows)})


def draft_from(table: Mapping[str, Any]) -> Draft:
    """A draft as ``dataclasses.asdict`` wrote it; raises TypeError or KeyError."""
    rows = {
        str(name): tuple(dict(row) for row in entries) for name, entries in table["rows"].items()
    }
    known = {name: dict(table[name]) for name in ("pipe", "goal", "half", "at")}
    return Draft(rows=rows, step=int(table["step"]), **known)


def job_of(draft: Draft) -> Job:
    """The job as far as it is known; raises InputError."""
    from fieldkit.job.schema import parse_job

    rows = {
        **draft.rows,
        "leg": draft.of("leg") or NO_LEG,
        "support": draft.of("support") or NO_SUPPORT,
    }
    return parse_job(draft_text(replace(draft, rows=rows)))


def span_of(draft: Draft) -> Span | None:
    """The span as far as it is known; None before the first leg; raises InputError."""
    if not draft.of("leg"):
        return None
    span = job_of(draft).span
    return span if draft.of("support") else replace(span, supports=())


def draft_text(draft: Draft) -> str:
    """The job file the answers make, with comments for who edits it by hand.

    Raises InputError where an answer cannot be written at all.
    """
    return "\n".join(
        [*_head(draft), *_pipe(draft), *_states(draft), *_tables(draft), *_goal(draft)]
    )


def _head(draft: Draft) -> Iterator[str]:
    yield '# Any quantity may be typed in any unit: "6.1 m", "20\' 3\\"", "11 kip/in".'
    yield "# Stations are distances along the pipe from its start, corner to corner."
    yield ""
    yield "fieldkit = 1"
    yield f"title = {rendered(draft.title)}"
    yield f"units = {rendered(draft.units)}    # what screens and sheets show"
    yield ""


def _pipe(draft: Draft) -> Iterator[str]:
    answers = draft.pipe
    size, schedule = answers.get("size", "").strip(), answers.get("schedule", "").strip()
    yield "[pipe]"
    yield _pair("outside_diameter" if measured_size(size) else "size", _named_size(size))
    yield _pair("wall" if measured_wall(schedule) else "schedule", schedule)
    yield _pair("material", answers.get("material") or "carbon steel")
    yield ""
    contents = answers.get("contents", "").strip() or "water"
    yield "[contents]"
    if is_quantity(contents, "density"):
        yield 'name = "contents"'
        yield _pair("density", contents)
    else:
        yield _pair("name", contents)
    yield ""


def _named_size(size: str) -> str:
    """``4`` is NPS 4: who reads the file must not wonder."""
    return f"NPS {size.strip()}" if re.fullmatch(r"[\d\s./-]+", size) else size


def _states(draft: Draft) -> Iterator[str]:
    answers = draft.pipe
    fill = FILLS.get(answers.get("tapped", "").strip().lower() or "full", answers.get("tapped", ""))
    yield "[state.tapped]    # how it stands when it is struck"
    yield f"fill = {rendered(value_of(fill, ('state', 'tapped', 'fill')))}"
    yield ""
    yield "[state.running]    # how it is when it shakes"
    yield "fill = 1.0"
    if temperature := answers.get("temperature", "").strip():
        yield _pair("temperature", temperature)
    yield ""


def _tables(draft: Draft) -> Iterator[str]:
    for number, row in enumerate(draft.of("leg")):
        yield (
            "[[leg]]"
            if number
            else "[[leg]]    # in order along the pipe; a bend joins each to the next"
        )
        yield from _pairs("leg", row, ("direction", "length", "bend_radius"))
    for row in draft.of("support"):
        yield "[[support]]"
        yield from _pairs("support", row, ("at", "kind", "vertical", "lateral"))
    for row in draft.of("mass"):
        yield "[[mass]]"
        yield from _pairs("mass", row, ("name", "at", "mass", "tolerance"))
    for row in draft.of("excitation"):
        yield "[[excitation]]"
        yield from _excitation(row)


def _pairs(table: str, row: Answers, keys: tuple[str, ...]) -> Iterator[str]:
    for key in keys:
        if typed := row.get(key, "").strip():
            yield f"{key} = {rendered(value_of(typed, (table, key)))}"
    yield ""


def _excitation(row: Answers) -> Iterator[str]:
    kind = row.get("machine", "").strip()
    yield _pair("name", row.get("name", "").strip() or kind or "excitation")
    speed = row.get("speed", "").strip()
    key = "frequency" if kind == FIXED else "speed"
    if speed:
        yield f"{key} = {rendered(value_of(speed, ('excitation', key)))}"
    if kind != FIXED:
        typed = row.get("orders", "").strip()
        orders = typed or orders_of(row) or "1"
        note = "" if typed or kind not in MACHINES else f"    # {orders_note(row)}"
        yield f"orders = {rendered(value_of(orders, ('excitation', 'orders')))}{note}"
    yield ""


def _goal(draft: Draft) -> Iterator[str]:
    answers = {"margin": "0.2", "chance": "0.9", "up_to": "200 Hz"}
    answers |= {key: text for key, text in draft.goal.items() if text.strip()}
    yield "[goal]"
    for key in ("margin", "chance"):
        yield f"{key} = {rendered(_share(answers[key], key))}"
    yield _pair("up_to", answers["up_to"])
    for key in ("keep_out",):
        if typed := answers.get(key, "").strip():
            yield f"{key} = {rendered(value_of(typed, ('goal', key)))}"
    yield ""


def _share(typed: str, key: str) -> object:
    """``20 %`` stands in the file as it was typed, 0.2 as a number."""
    return value_of(typed, ("goal", key))


def _pair(key: str, typed: str) -> str:
    return f"{key} = {rendered(typed.strip())}"


def orders_of(row: Answers) -> str:
    """The orders that the kind of machine is known for, with what was counted on it."""
    machine = MACHINES.get(row.get("machine", "").strip())
    return orders_text(machine.orders(_count(row))) if machine else ""


def orders_note(row: Answers) -> str:
    """What those orders stand for."""
    machine = MACHINES[row.get("machine", "").strip()]
    return f"{machine.said(_count(row))} (common practice)"


def _count(row: Answers) -> int:
    typed = row.get("count", "").strip()
    return int(typed) if typed.isdigit() else 0


def measured_size(text: str) -> bool:
    """Whether a pipe size is a measured diameter, such as ``88.9 mm``, and no nominal one."""
    return not _nominal(text) and is_quantity(text, "length")


def measured_wall(text: str) -> bool:
    """Whether a schedule is a measured wall, such as ``5.5 mm``."""
    return bool(re.search(r"\d\s*(?:mm|cm|m|in|inch|\"|'')\s*$", text.strip()))


def _nominal(text: str) -> bool:
    from fieldkit.span.pipes import known_schedules

    try:
        known_schedules(text)
    except InputError:
        return False
    return True


def is_quantity(text: str, dimension: str) -> bool:
    """Whether a text is a quantity of a dimension."""
    try:
        parse(text, dimension)
    except InputError:
        return False
    return True
