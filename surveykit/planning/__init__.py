"""The plan of a survey day, from its parameter file and what earlier campaigns showed."""

from surveykit.planning.day import Plan, make, sun_course, sun_windows
from surveykit.planning.order import (
    SAFETY,
    duration_min,
    field_sheet,
    fits,
    order,
    rounds_needed,
    visit_minutes,
)

__all__ = ["SAFETY", "Plan", "duration_min", "field_sheet", "fits",
           "make", "order",
           "rounds_needed", "sun_course", "sun_windows", "visit_minutes"]
