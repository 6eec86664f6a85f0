"""All that a notebook calls to draw: `show(figures.interval_plots(surfaces, labels))`.

Each function takes finished tables and returns a `Drawing` (figure, alt text, caption), or several
as a tuple; where there is nothing to draw, the drawing holds only a sentence that says so.
"""

from __future__ import annotations

from .figures_clocks import clock_plots as clock_plots
from .figures_passes import cooling_plot as cooling_plot
from .figures_passes import height_plot as height_plot
from .figures_passes import histogram_plots as histogram_plots
from .figures_passes import map_plots as map_plots
from .figures_passes import placement_plot as placement_plot
from .figures_records import budget_plot as budget_plot
from .figures_records import day_timeline as day_timeline
from .figures_records import ledger_plot as ledger_plot
from .figures_results import change_plots as change_plots
from .figures_results import difference_matrices as difference_matrices
from .figures_results import interval_plots as interval_plots
from .figures_results import rank_plots as rank_plots
from .figures_steps import correction_plots as correction_plots
from .figures_steps import series_plots as series_plots
from .style import Drawing as Drawing
from .style import show as show
