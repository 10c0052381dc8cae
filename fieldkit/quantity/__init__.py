"""Text to SI and SI to text: the only place where units are converted."""

from fieldkit.quantity.calibration import scale_of
from fieldkit.quantity.choice import chosen
from fieldkit.quantity.dimensions import DIMENSIONS, Dimension
from fieldkit.quantity.display import show
from fieldkit.quantity.reading import parse, quoted

__all__ = ["DIMENSIONS", "Dimension", "chosen", "parse", "quoted", "scale_of", "show"]
