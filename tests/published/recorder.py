"""What each published check compared: every ``pytest.approx`` of a run, by test.

A plugin for one run in one process: ``pytest.main(..., plugins=[Recorder()])``. The checks
themselves know nothing of it.
"""

from __future__ import annotations

import inspect
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import pytest


@dataclass(frozen=True)
class Comparison:
    """One value or row of values held against another."""

    expected: tuple[float, ...]
    found: tuple[float, ...]
    relative: float | None
    """Tolerances as the check states them."""
    absolute: float | None

    @property
    def difference(self) -> float:
        """Largest, relative to the value expected, or to the largest where one is zero."""
        return self._share(np.abs(np.subtract(self.found, self.expected)))

    @property
    def allowed(self) -> float:
        """Least difference that fails, relative likewise; 1e-6 where the check says nothing."""
        stated = self.relative is not None
        relative = self.relative if stated else (1e-6 if self.absolute is None else 0.0)
        return self._share(np.maximum(relative * np.abs(self.expected), self.absolute or 0.0))

    def _share(self, amounts: np.ndarray) -> float:
        size = np.abs(self.expected)
        scale = np.where(size > 0, size, size.max(initial=0.0) or 1.0)
        return float(np.max(amounts / scale, initial=0.0))


@dataclass
class Check:
    """One test function, all its cases."""

    name: str
    says: str
    """Its docstring."""
    compared: list[tuple[str, Comparison]] = field(default_factory=list)
    """By case."""
    outcomes: list[str] = field(default_factory=list)
    reasons: set[str] = field(default_factory=set)
    """Why cases were skipped."""


@dataclass
class Document:
    """One file of checks."""

    path: Path
    says: str
    checks: dict[str, Check] = field(default_factory=dict)


class Recorder:
    """Fills ``documents`` while pytest runs."""

    def __init__(self) -> None:
        self.documents: dict[Path, Document] = {}
        self._now: tuple[Check, str] | None = None

    @pytest.hookimpl(hookwrapper=True)
    def pytest_runtest_protocol(self, item: pytest.Item) -> Iterator[None]:
        """Note which test the comparisons to come belong to."""
        if isinstance(item, pytest.Function):
            self._now = self._check(item), item.name.partition("[")[2].removesuffix("]")
        with watched_approx(self._compared):
            yield
        self._now = None

    def pytest_runtest_logreport(self, report: pytest.TestReport) -> None:
        """Note how a test ended."""
        if self._now is None or (report.when != "call" and report.passed):
            return
        check, _ = self._now
        check.outcomes.append(report.outcome)
        if report.skipped and isinstance(report.longrepr, tuple):
            check.reasons.add(report.longrepr[2].removeprefix("Skipped: "))

    def _check(self, item: pytest.Function) -> Check:
        document = self.documents.setdefault(
            item.path, Document(item.path, inspect.getdoc(item.module) or "")
        )
        name = item.originalname
        return document.checks.setdefault(name, Check(name, inspect.getdoc(item.function) or ""))

    def _compared(self, comparison: Comparison) -> None:
        if self._now is not None:
            check, case = self._now
            check.compared.append((case, comparison))


@contextmanager
def watched_approx(tell: Any) -> Iterator[None]:
    """``pytest.approx`` tells each comparison of numbers, and compares as ever."""
    plain = pytest.approx

    def approx(expected: Any, *args: Any, **tolerances: Any) -> Any:
        made = plain(expected, *args, **tolerances)
        kind = type(made)

        def equal(self: Any, actual: Any) -> bool:
            told = _numbers(expected), _numbers(actual)
            if told[0] is not None and told[1] is not None and len(told[0]) == len(told[1]):
                tell(Comparison(told[0], told[1], made.rel, made.abs))
            return bool(kind.__eq__(self, actual))

        made.__class__ = type(kind.__name__, (kind,), {"__eq__": equal, "__hash__": None})
        return made

    pytest.approx = approx
    try:
        yield
    finally:
        pytest.approx = plain


def _numbers(value: Any) -> tuple[float, ...] | None:
    """Finite numbers in a row, None where there are others."""
    if isinstance(value, dict):
        value = list(value.values())
    try:
        row = np.asarray(value, dtype=float).ravel()
    except (TypeError, ValueError):
        return None
    return tuple(map(float, row)) if np.all(np.isfinite(row)) else None
