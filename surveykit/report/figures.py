"""All that a notebook calls to draw: `show(figures.interval_plots(surfaces, labels))`.

Each function takes finished tables and returns a `Drawing` (figure, alt text, caption), or several
as a tuple; where there is nothing to draw, the drawing holds only a sentence that says so.
"""

from __future__ import annotations

# ruff: noqa: F401 - imported to be called from here
from .figures_clocks import clock_plots
from .figures_passes import cooling_plot, height_plot, histogram_plots, map_plots, placement_plot
from .figures_records import budget_plot, day_timeline, ledger_plot
from .figures_results import change_plots, difference_matrices, interval_plots, rank_plots
from .figures_steps import correction_plots, series_plots
from .style import Drawing, show
