"""Text to SI and SI to text: the only place where units are converted."""

from fieldkit.quantity.dimensions import DIMENSIONS, Dimension
from fieldkit.quantity.display import show
from fieldkit.quantity.reading import parse, quoted

__all__ = ["DIMENSIONS", "Dimension", "parse", "quoted", "show"]
