"""Widgets that draw: spectrum, recording, frequency ruler and span."""

from fieldkit.ui.widgets.band_art import BandShade
from fieldkit.ui.widgets.ruler import FrequencyRuler, RulerData
from fieldkit.ui.widgets.span_drawing import ShapeLine, SpanDrawing
from fieldkit.ui.widgets.spectrum_data import Curve, Mark
from fieldkit.ui.widgets.spectrum_plot import SpectrumPlot
from fieldkit.ui.widgets.time_plot import DecayLine, TapMark, TimePlot

__all__ = [
    "BandShade",
    "Curve",
    "DecayLine",
    "FrequencyRuler",
    "Mark",
    "RulerData",
    "ShapeLine",
    "SpanDrawing",
    "SpectrumPlot",
    "TapMark",
    "TimePlot",
]
