"""All that a notebook calls to draw: `show(figures.interval_plots(surfaces, labels))`.

Each function takes finished tables and returns a `Drawing` (figure, alt text, caption), or several
as a tuple; where there is nothing to draw, the drawing holds only a sentence that says so.
"""

from __future__ import annotations

from .figures_clocks import clock_plots
from .figures_records import budget_plot, day_timeline, ledger_plot
from .figures_results import (
    change_plot,
    change_plots,
    difference_matrices,
    difference_matrix,
    interval_plot,
    interval_plots,
)
from .figures_steps import correction_plots, placement_plot, series_plots
from .style import Drawing, show

__all__ = [
    "Drawing", "budget_plot", "change_plot", "change_plots", "clock_plots", "correction_plots",
    "day_timeline",
    "difference_matrices", "difference_matrix", "interval_plot", "interval_plots", "ledger_plot",
    "placement_plot", "series_plots", "show",
]
