"""Fields that hold something known by name: pipe sizes, schedules, materials, contents."""

from __future__ import annotations

from dataclasses import dataclass

from fieldkit.errors import InputError
from fieldkit.quantity import parse, quoted, show


@dataclass(frozen=True)
class PipeSize:
    """A nominal size, or a measured outside diameter where that is allowed."""

    measured: bool = False

    @property
    def hint(self) -> str:
        """How to type it."""
        more = ", or a measured diameter: 88.9 mm" if self.measured else ""
        return f"NPS 3, 2-1/2 or DN 80{more}"

    def shown(self, value: object, units: str) -> str:
        """The outside diameter."""
        from fieldkit.span.pipes import known_schedules, standard_pipe

        text = str(value)
        try:
            pipe = standard_pipe(text, known_schedules(text)[0])
        except InputError:
            if not self.measured:
                raise InputError(
                    f"there is no standard pipe size {quoted(text)}", f"write {self.hint}"
                ) from None
            return f"OD {show(parse(text, 'length'), 'length', units)}"
        return f"OD {show(pipe.outside_diameter_m, 'length', units)}"


@dataclass(frozen=True)
class Schedule:
    """A schedule of any size, or a measured wall where that is allowed."""

    measured: bool = False

    @property
    def hint(self) -> str:
        """How to type it."""
        return f"40, 80, STD, XS, 10S{', or a measured wall: 5.5 mm' if self.measured else ''}"

    def shown(self, value: object, units: str) -> str:
        """A measured wall; nothing to add to a schedule."""
        from fieldkit.job.draft import measured_wall
        from fieldkit.span.pipes import is_schedule

        text = str(value)
        if is_schedule(text):
            return ""
        if self.measured and measured_wall(text):
            return f"wall {show(parse(text, 'length'), 'length', units)}"
        raise InputError(f"there is no schedule {quoted(text)}", f"write {self.hint}")


@dataclass(frozen=True)
class MaterialName:
    """A material of the list, or a table with its numbers."""

    hint: str = "a name from the list, or { elastic_modulus = ..., density = ..., poisson = ... }"

    def shown(self, value: object, units: str) -> str:
        """The name it is listed under."""
        from fieldkit.span.materials import material

        return "its own numbers" if isinstance(value, dict) else material(str(value)).name


@dataclass(frozen=True)
class ContentsName:
    """Contents of the list, or their density."""

    density: bool = False
    """Whether a density may stand in place of the name."""

    @property
    def hint(self) -> str:
        """How to type it."""
        return f"a name from the list{', or a density: 1045 kg/m^3' if self.density else ''}"

    def shown(self, value: object, units: str) -> str:
        """The density."""
        from fieldkit.job.draft import is_quantity
        from fieldkit.span.materials import contents_density

        text = str(value)
        known = self.density and is_quantity(text, "density")
        density = parse(text, "density") if known else contents_density(text)
        return show(density, "density", units)
