"""Forms for the rows of a job: what each key means, and the window to type it in."""

from fieldkit.ui.forms.rows import (
    JobRow,
    row_label,
    rows_of,
    texts_of,
    with_values,
    without_taps,
)
from fieldkit.ui.forms.tables import FORMS, Form
from fieldkit.ui.forms.window import FormWindow, Values

__all__ = [
    "FORMS",
    "Form",
    "FormWindow",
    "JobRow",
    "Values",
    "row_label",
    "rows_of",
    "texts_of",
    "with_values",
    "without_taps",
]
