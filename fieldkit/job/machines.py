"""Which orders of its speed a kind of machine shakes a pipe at.

All of it is common practice, no source: where to look first, not what a certain machine does.
What is counted on the machine (vanes, cylinders, lobes) gives the order of its pulsation.
"""

from __future__ import annotations

from dataclasses import dataclass

FIXED = "steady frequency"
"""What shakes without a shaft speed: mains hum, a vortex, a relief valve that chatters."""


@dataclass(frozen=True)
class Machine:
    """A kind of machine."""

    name: str
    always: tuple[float, ...]
    """Orders to expect whatever is counted."""
    counted: str = ""
    """What its pulsation is counted by, such as ``vanes``; empty where nothing is."""
    per_count: tuple[float, ...] = ()
    """Orders for each thing counted."""
    why: str = ""
    """What the orders stand for."""

    def orders(self, count: int = 0) -> tuple[float, ...]:
        """In rising order; ``count`` 0 leaves out what is counted."""
        pulsation = tuple(count * share for share in self.per_count) if count > 0 else ()
        return tuple(sorted({*self.always, *pulsation}))

    def said(self, count: int = 0) -> str:
        """What the orders stand for, with what was counted."""
        if not self.counted:
            return self.why
        return f"{self.why}, {count} {self.counted}" if count > 0 else self.why


MACHINES: dict[str, Machine] = {
    machine.name: machine
    for machine in (
        Machine("centrifugal pump", (1, 2), "vanes", (1,), "unbalance, misalignment"),
        Machine("plunger pump", (1, 2), "plungers", (1, 2), "crank, its double"),
        Machine("screw pump", (1, 2), "lobes", (1, 2), "unbalance, misalignment"),
        Machine("gear pump", (1, 2), "teeth", (1,), "unbalance, misalignment"),
        Machine("reciprocating compressor", (1, 2, 3, 4), "", (), "crank and its multiples"),
        Machine("screw compressor", (1, 2), "lobes", (1, 2), "unbalance, misalignment"),
        Machine("lobe blower", (1,), "lobes", (2, 4), "unbalance; both rotors pulse"),
        Machine("fan", (1, 2), "blades", (1,), "unbalance, misalignment"),
        Machine("turbine or centrifugal compressor", (1, 2), "", (), "unbalance, misalignment"),
        Machine("four-stroke engine", (0.5, 1, 1.5, 2), "cylinders", (0.5, 1),
                "cycle, crank, firing"),
        Machine("electric motor", (1, 2), "", (), "unbalance, misalignment"),
        Machine("other machine", (1, 2), "", (), "unbalance, misalignment"),
        Machine(FIXED, ()),
    )
}  # fmt: skip


def orders_text(orders: tuple[float, ...]) -> str:
    """``1, 2, 7``."""
    return ", ".join(f"{order:g}" for order in orders)
