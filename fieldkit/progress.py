"""How long work tells what it is doing and asks whether to stop."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from fieldkit.errors import Cancelled


def _say_nothing(_message: str, _fraction: float) -> None:
    pass


def _never() -> bool:
    return False


@dataclass(frozen=True)
class Progress:
    """Handed down into long work; the default is silent and never stops."""

    on_step: Callable[[str, float], object] = _say_nothing
    """Called with what is being done and how far it is, 0 to 1."""
    stop: Callable[[], bool] = _never

    def within(self, start: float, end: float) -> Progress:
        """The same for a part of the work that runs from ``start`` to ``end`` of the whole."""

        def scaled(message: str, fraction: float) -> None:
            self.on_step(message, start + (end - start) * fraction)

        return Progress(scaled, self.stop)

    def step(self, message: str, fraction: float) -> None:
        """Report a step; raises Cancelled when the user asked to stop."""
        if self.stop():
            raise Cancelled("stopped on request")
        self.on_step(message, fraction)
