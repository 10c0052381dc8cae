"""Writes docs/validation.md from the checks themselves: ``python -m tests.published.page``.

``--spans 200`` says how many random spans go against exact dynamic stiffness on the same page.
"""

from __future__ import annotations

import argparse
import contextlib
import os
import re
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from tests.bench import exact_spans
from tests.published.recorder import Check, Comparison, Document, Recorder

ROOT = Path(__file__).parents[2]
PAGE = ROOT / "docs" / "validation.md"
COMMAND = "python -m tests.published.page"
SHOWN = 13
"""Values of a row; of a longer one the first, and how many there are."""
ROUNDING = 1e-10
"""A relative difference below this one differs from one processor to the next."""
INTRODUCTION = f"""\
# Every value checked against the outside world

`{COMMAND}` runs the checks in `tests/published` and writes this page
from what they compared; no figure is typed by hand. The source of a value stands in the text over
its table, or beside the value in the file named. *From memory* marks a published value that was
recalled, not read.

- **Stated**: the value the check holds on to. **Found**: what fieldkit gave.
- **Difference**: the largest in the row, relative to the value stated.
- **Allowed**: the difference at which the check fails.
- A check without a table holds a property, not a number.
"""


def main() -> None:
    """Run the checks and write the page; exit status 1 where one fails."""
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--spans", type=int, default=200)
    asked.add_argument("--write", type=Path, default=PAGE)
    asked.add_argument("checks", nargs="*", default=["tests/published"])
    options = asked.parse_args()
    recorder, failed = run(options.checks)
    parts = [INTRODUCTION, *totals(recorder), *map("\n".join, map(section, documents(recorder)))]
    if options.spans:
        parts.append(exact_spans.section(exact_spans.measured(1, options.spans)))
    options.write.write_text("\n".join(parts), "utf-8")
    sys.exit(failed)


def run(checks: list[str]) -> tuple[Recorder, int]:
    """What the checks compared, and 1 where one fails."""
    recorder = Recorder()
    words = ["-q", "-n", "0", "-p", "no:cacheprovider", "--rootdir", str(ROOT), *checks]
    with contextlib.chdir(ROOT):
        status = pytest.main(words, plugins=[recorder])
    return recorder, int(status != pytest.ExitCode.OK)


def documents(recorder: Recorder) -> list[Document]:
    """In order of their names."""
    return [recorder.documents[path] for path in sorted(recorder.documents)]


def totals(recorder: Recorder) -> Iterator[str]:
    """One sentence over all."""
    checks = [c for document in recorder.documents.values() for c in document.checks.values()]
    outcomes = [outcome for check in checks for outcome in check.outcomes]
    values = sum(len(found.expected) for check in checks for _, found in check.compared)
    counted = {kind: outcomes.count(kind) for kind in ("passed", "failed", "skipped")}
    yield (
        f"{len(checks)} checks in {len(outcomes)} cases: {counted['passed']} passed, "
        f"{counted['failed']} failed, {counted['skipped']} skipped; {values} values compared.\n"
    )


def section(document: Document) -> Iterator[str]:
    """Heading, source and checks of one file."""
    title, _, rest = document.says.partition("\n")
    yield f"\n## {title.rstrip('.:')}\n"
    if rest.strip():
        yield _prose(rest) + "\n"
    yield f"`{os.path.relpath(document.path, ROOT)}`\n"
    for check in document.checks.values():
        yield from _check(check)


def _check(check: Check) -> Iterator[str]:
    name = check.name.removeprefix("test_").replace("_", " ")
    says = f" {_prose(check.says)}" if check.says else ""
    yield f"**{name[0].upper()}{name[1:]}.**{says} *{_outcome(check)}*\n"
    if check.compared:
        yield "| case | stated | found | difference | allowed |"
        yield "| --- | --- | --- | --- | --- |"
        yield from (_row(case, comparison) for case, comparison in check.compared)
        yield ""


def _outcome(check: Check) -> str:
    counted = [f"{check.outcomes.count(kind)} {kind}" for kind in sorted(set(check.outcomes))]
    told = ", ".join(counted) if len(check.outcomes) > 1 else "".join(check.outcomes)
    return "; ".join([told or "not run", *sorted(check.reasons)])


def _row(case: str, comparison: Comparison) -> str:
    cells = [
        case.replace("|", "/"),
        _values(comparison.expected),
        _values(comparison.found),
        _percent(comparison.difference),
        _percent(comparison.allowed),
    ]
    return f"| {' | '.join(cells)} |"


def _values(row: tuple[float, ...]) -> str:
    if len(row) > SHOWN:
        return f"{', '.join(map(_number, row[:3]))}, … ({len(row)} values)"
    return ", ".join(map(_number, row))


def _number(value: float) -> str:
    return "0" if abs(value) < ROUNDING**1.5 else f"{value:.7g}"


def _percent(share: float) -> str:
    return "0" if share == 0 else "rounding" if share < ROUNDING else f"{100 * share:.2g} %"


def _prose(text: str) -> str:
    """A docstring as one paragraph, code marks and stars kept from becoming markup."""
    joined = re.sub(r"\s+", " ", text.strip()).replace("``", "`")
    return re.sub(r"(?<!\\)([*_|<])", r"\\\1", joined)


if __name__ == "__main__":
    main()
