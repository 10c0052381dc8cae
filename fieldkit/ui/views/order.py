"""The six views in the order of the work; loaded after the first paint."""

from fieldkit.ui.views.base import View
from fieldkit.ui.views.detune import DetuneView
from fieldkit.ui.views.match import MatchView
from fieldkit.ui.views.running import RunningView
from fieldkit.ui.views.sheet import SheetView
from fieldkit.ui.views.span import SpanView
from fieldkit.ui.views.tap import TapView

VIEWS: tuple[type[View], ...] = (
    TapView,
    RunningView,
    SpanView,
    MatchView,
    DetuneView,
    SheetView,
)
